package poll

import (
	"context"
	"errors"
	"time"

	"chargehand/protocol/link"
	"chargehand/protocol/registermap"
)

// Survey is what one reading of a map's neighbourhood brought.
type Survey struct {
	Words   registermap.Words
	Refused []Refusal // what could not be read, and why
	At      time.Time // by the link's clock, when it was done
}

// Refusal is a stretch of registers that gave no words.
type Refusal struct {
	Span registermap.Span
	Err  error
}

// Look reads the registers of a map's signals and three to each side of them, in both sister tables, and nothing else. A
// stretch that is refused is halved down to single registers. An error other than a refusal ends it, with what came so far.
func Look(ctx context.Context, l *link.Link, own uint8, m registermap.Map) (Survey, error) {
	s := Survey{Words: registermap.Words{}}
	todo := m.Neighbourhood(own)
	for len(todo) > 0 {
		span := todo[0]
		todo = todo[1:]
		a, err := l.Unit(span.UnitID).Read(ctx, link.Function(span.Table.FunctionCode()), int(span.Address), span.Quantity)
		switch e := err; {
		case e == nil:
			s.Words.Put(span, asWords(a))
		case !isRefusal(e):
			s.At = l.Now()
			s.Refused = append(s.Refused, Refusal{span, e})
			return s, e
		case span.Quantity == 1 || isWholeTable(e):
			s.Refused = append(s.Refused, Refusal{span, e})
		default:
			low, high := halves(span)
			todo = append([]registermap.Span{low, high}, todo...)
		}
	}
	s.At = l.Now()
	return s, nil
}

// isWholeTable tells exception 1, by which a device says that it has no such table at all.
func isWholeTable(err error) bool {
	e, ok := errors.AsType[*link.ExceptionError](err)
	return ok && e.Code == 1
}

func halves(s registermap.Span) (low, high registermap.Span) {
	low, high = s, s
	low.Quantity = s.Quantity / 2
	high.Address += registermap.Address(low.Quantity)
	high.Quantity -= low.Quantity
	return low, high
}
