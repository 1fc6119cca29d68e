package ask

import (
	"strings"

	tea "github.com/charmbracelet/bubbletea"
	"github.com/charmbracelet/huh"
)

// picker is a menu in which the beginning of a word moves the cursor to it, as it answers in plain lines. Enter alone
// takes what the cursor stands on.
type picker struct {
	*huh.Select[string]
	value *string
	words []pick
	typed string // since the last key that was no letter
}

// pick is one entry of a menu: what may be typed for it, and its value.
type pick struct {
	words []string
	value string
}

// Update takes letters as the beginning of a word; every other key is the menu's.
func (p *picker) Update(msg tea.Msg) (tea.Model, tea.Cmd) {
	if key, ok := msg.(tea.KeyMsg); ok {
		if key.Type == tea.KeyRunes && !key.Alt {
			p.letters(key.Runes)
			return p, nil
		}
		p.typed = ""
	}
	_, cmd := p.Select.Update(msg)
	return p, cmd
}

// letters moves the cursor to the first entry that begins with what was typed. What fits none begins anew with its
// last letter.
func (p *picker) letters(runes []rune) {
	for _, r := range runes {
		typed := strings.ToLower(string(r))
		if value, ok := p.beginning(p.typed + typed); ok {
			p.typed += typed
			p.move(value)
		} else if value, ok := p.beginning(typed); ok {
			p.typed = typed
			p.move(value)
		} else {
			p.typed = ""
		}
	}
}

// beginning finds the first entry with a word that begins with a text.
func (p *picker) beginning(text string) (value string, ok bool) {
	for _, entry := range p.words {
		for _, w := range entry.words {
			if strings.HasPrefix(strings.ToLower(w), text) {
				return entry.value, true
			}
		}
	}
	return "", false
}

func (p *picker) move(value string) {
	*p.value = value
	p.Select.Value(p.value)
}
