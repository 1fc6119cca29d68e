package measure

import (
	"bytes"
	"unicode/utf8"

	"gopkg.in/yaml.v3"
)

// The functions of this file find where a node of the tree ends in the text; the tree itself knows only where each
// begins.

// begin gives the offset of a node's first byte.
func (s *source) begin(n *yaml.Node) int { return s.offset(n.Line, n.Column) }

// end gives the offset after a node's last byte, comments and line end left out.
func (s *source) end(n *yaml.Node) int {
	at := s.begin(n)
	switch {
	case n.Kind != yaml.ScalarNode:
		return s.endOfCollection(n, at)
	case n.Style&yaml.SingleQuotedStyle != 0, n.Style&yaml.DoubleQuotedStyle != 0:
		return s.endOfQuoted(at)
	case n.Style&(yaml.LiteralStyle|yaml.FoldedStyle) != 0:
		return s.endOfBlockText(n, at)
	}
	return s.follow(n.Value, at)
}

// endOfCollection gives the end of a map or list: that of its last entry, for the flow style the closing bracket.
func (s *source) endOfCollection(n *yaml.Node, at int) int {
	opened := n.Style&yaml.FlowStyle != 0 && at < len(s.raw) && (s.raw[at] == '{' || s.raw[at] == '[')
	end := at
	if opened {
		end++
	}
	if len(n.Content) > 0 {
		end = s.end(n.Content[len(n.Content)-1])
		if n.Kind == yaml.MappingNode {
			end = max(end, s.afterColon(n.Content[len(n.Content)-2]))
		}
	}
	if !opened {
		return end
	}
	for end < len(s.raw) && s.raw[end] != '}' && s.raw[end] != ']' {
		if s.raw[end] == '#' {
			end = s.endOfLine(end)
			continue
		}
		end++
	}
	return min(end+1, len(s.raw))
}

// endOfQuoted gives the offset after the closing quote.
func (s *source) endOfQuoted(at int) int {
	if at >= len(s.raw) {
		return at
	}
	quote := s.raw[at]
	for i := at + 1; i < len(s.raw); i++ {
		switch {
		case quote == '"' && s.raw[i] == '\\':
			i++
		case quote == '\'' && s.raw[i] == quote && i+1 < len(s.raw) && s.raw[i+1] == quote:
			i++
		case s.raw[i] == quote:
			return i + 1
		}
	}
	return len(s.raw)
}

// endOfBlockText gives the end of a text behind | or >: the end of its last line; blank lines that count (|+) are
// part of it.
func (s *source) endOfBlockText(n *yaml.Node, at int) int {
	header := s.endOfLine(at)
	keep := bytes.ContainsRune(bytes.SplitN(s.raw[at:header], []byte("#"), 2)[0], '+')
	end := s.endOfLine(s.follow(n.Value, header))
	for keep && end < len(s.raw) {
		next := s.nextLine(end)
		stop := s.endOfLine(next)
		if next >= len(s.raw) || len(bytes.TrimSpace(s.raw[next:stop])) > 0 {
			break
		}
		end = stop
	}
	return end
}

// follow reads along the text until every visible character of a value has passed, and gives the offset after it.
// Plain and block texts have no escapes, so only blanks and line ends differ between text and value.
func (s *source) follow(value string, at int) int {
	end := at
	for _, want := range value {
		if isBlank(want) {
			continue
		}
		for {
			r, n := utf8.DecodeRune(s.raw[at:])
			if n == 0 {
				return end
			}
			at += n
			if r == want {
				break
			}
		}
		end = at
	}
	return end
}

// isBlank tells whether a character may differ between a text and its value.
func isBlank(r rune) bool { return r == ' ' || r == '\t' || r == '\n' || r == '\r' }

// endOfLine gives the offset of the line end at or after an offset.
func (s *source) endOfLine(at int) int {
	if i := bytes.IndexAny(s.raw[at:], "\r\n"); i >= 0 {
		return at + i
	}
	return len(s.raw)
}

// nextLine gives the offset of the line after the one whose end is given.
func (s *source) nextLine(end int) int {
	if end < len(s.raw) && s.raw[end] == '\r' {
		end++
		if end < len(s.raw) && s.raw[end] == '\n' {
			end++
		}
		return end
	}
	return min(end+1, len(s.raw))
}

// afterColon gives the offset after the colon that follows a key; the key's end when there is none.
func (s *source) afterColon(key *yaml.Node) int {
	end := s.end(key)
	for i := end; i < len(s.raw); i++ {
		switch {
		case s.raw[i] == ':':
			return i + 1
		case !isBlank(rune(s.raw[i])):
			return end
		}
	}
	return end
}

// between gives the text between two offsets.
func (s *source) between(from, to int) string { return string(s.raw[from:max(from, to)]) }
