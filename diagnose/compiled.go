package diagnose

import (
	"reflect"
	"time"

	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

// Compiled is a rule base made ready for one board: what applies to it, the rival explanations with their weights,
// the network and its base rates. A session keeps it between answers; a changed board is compiled anew by itself.
// Results are those of the package's functions. It is for one goroutine at a time.
type Compiled struct {
	base *knowledge.Base
	view *view
}

// For holds a rule base; the board is compiled at the first question.
func For(base *knowledge.Base) *Compiled { return &Compiled{base: base} }

// of gives the view of a case's board, the kept one if the board is still the same.
func (c *Compiled) of(board measure.Board) (*view, error) {
	if c.view != nil && reflect.DeepEqual(c.view.board, board) {
		return c.view, nil
	}
	v, err := newView(c.base, board)
	if err != nil {
		return nil, err
	}
	c.view = v
	return v, nil
}

// Rank is the package's Rank.
func (c *Compiled) Rank(cs *measure.Case, computed map[string]stress.Span, about string) (*Ranking, error) {
	v, err := c.of(cs.Board)
	if err != nil {
		return nil, err
	}
	return v.rank(cs, computed, about)
}

// Next is the package's Next.
func (c *Compiled) Next(cs *measure.Case, computed map[string]stress.Span, now time.Time) (*Suggestion, error) {
	v, err := c.of(cs.Board)
	if err != nil {
		return nil, err
	}
	return v.next(cs, computed, now)
}
