package api

import (
	"sync"

	"github.com/labstack/echo/v4"

	"nearmargin/api/wire"
	"nearmargin/setting"
)

// point answers for one site.
func (s *Server) point(c echo.Context) error {
	q := newQuery(c.Request().URL.RawQuery, "lon", "lat", "depth_km", "uncertainty_km", "age_ma", "motion", "motion_fallback", "model")
	site := setting.Site{
		Lon:           q.number("lon", true),
		Lat:           q.number("lat", true),
		DepthKm:       q.number("depth_km", false),
		UncertaintyKm: q.number("uncertainty_km", false),
		AgeMa:         q.number("age_ma", false),
	}
	if err := q.err(); err != nil {
		return err
	}
	l, err := s.lookup(c, q, false)
	if err != nil {
		return err
	}
	room := answerRooms.Get().(*answerRoom)
	defer answerRooms.Put(room)
	if err := l.At(site, &room.answer); err != nil {
		return err
	}
	room.body = append(wire.AppendAnswer(room.body[:0], &room.answer), '\n')
	return sendBytes(c, echo.MIMEApplicationJSON, room.body)
}

// answerRoom is what one answer and its text take, kept for the next request.
type answerRoom struct {
	answer setting.Answer
	body   []byte
}

var answerRooms = sync.Pool{New: func() any { return new(answerRoom) }}
