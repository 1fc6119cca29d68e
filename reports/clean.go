package reports

import (
	"strings"
	"unicode"
	"unicode/utf8"

	"golang.org/x/text/width"
)

// longest is how many runes of one text from outside a page carries; what is cut says so. No field of a bench record
// needs more, and a page that is drowned in one field is of no use.
const longest = 4000

// plain makes a text from outside harmless for every output: one line, no control or invisible characters, no
// change of writing direction, of bounded length. Ordinary right-to-left text and emoji stay.
func plain(text string) string {
	var b strings.Builder
	n, space := 0, false
	for _, r := range text {
		switch {
		case unicode.IsSpace(r):
			space = n > 0
			continue
		case r == '\u200d' || r == '\u200c': // joiners are part of words and emoji
		case r == utf8.RuneError || unicode.IsControl(r):
			r = '\ufffd'
		case unicode.Is(unicode.Cf, r), unicode.Is(unicode.Co, r), unicode.Is(unicode.Cs, r):
			continue
		}
		if n >= longest {
			b.WriteString(" … (cut)")
			return b.String()
		}
		if space {
			b.WriteByte(' ')
			n, space = n+1, false
		}
		b.WriteRune(r)
		n++
	}
	return b.String()
}

// columns is how many columns of a terminal a text takes: never too few, so that a line never runs over.
func columns(text string) int {
	n := 0
	for _, r := range text {
		n += runeColumns(r)
	}
	return n
}

func runeColumns(r rune) int {
	switch {
	case unicode.In(r, unicode.Mn, unicode.Me, unicode.Cf):
		return 0
	case r >= 0x2300 && unicode.Is(unicode.So, r): // pictures: two columns on many terminals
		return 2
	}
	switch width.LookupRune(r).Kind() {
	case width.EastAsianWide, width.EastAsianFullwidth:
		return 2
	}
	return 1
}

// fit cuts a text to a number of columns, with an ellipsis where something is missing.
func fit(text string, most int) string {
	if columns(text) <= most {
		return text
	}
	n := 0
	for i, r := range text {
		n += runeColumns(r)
		if n > most-1 {
			return strings.TrimRight(text[:i], " ") + "…"
		}
	}
	return text
}

// fold breaks a text into lines of at most so many columns, at blanks where there are any.
func fold(text string, most int) []string {
	var lines []string
	line, used := "", 0
	for _, word := range strings.Fields(text) {
		for columns(word) > most {
			if used > 0 {
				lines = append(lines, line)
				line, used = "", 0
			}
			head := cutAt(word, most)
			lines, word = append(lines, head), word[len(head):]
		}
		n := columns(word)
		switch {
		case n == 0:
		case used == 0:
			line, used = word, n
		case used+1+n <= most:
			line, used = line+" "+word, used+1+n
		default:
			lines = append(lines, line)
			line, used = word, n
		}
	}
	if used > 0 {
		lines = append(lines, line)
	}
	return lines
}

// cutAt gives the longest head of a word that fits, at least one rune.
func cutAt(word string, most int) string {
	n := 0
	for i, r := range word {
		n += runeColumns(r)
		if n > most && i > 0 {
			return word[:i]
		}
	}
	return word
}

// short gives a title without what stands behind its colon when the whole is too long. It never cuts a word: what is
// still too long wraps where it is written.
func short(title string, most int) string {
	if columns(title) > most {
		if head, _, found := strings.Cut(title, ": "); found {
			title = head
		}
	}
	return title
}
