// Package quiet keeps the program from questioning the terminal as it starts. The library below the menus asks every
// terminal for its background colour in an init function, and waits five seconds for one that does not answer: a
// serial line, a recorder, a script. Its answer is not needed, as the menus use no colour of their own.
//
// It works by order: Go initialises, of all packages whose imports are ready, the one whose path sorts first, and this
// path sorts before that of the library. A test holds it to that.
package quiet

import "github.com/charmbracelet/lipgloss"

func init() { lipgloss.SetHasDarkBackground(true) }
