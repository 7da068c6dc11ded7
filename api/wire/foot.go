package wire

import "nearmargin/setting"

// foot writes what every answer ends with: the model and the notes.
func (o *object) foot(m *setting.Model, notes []setting.Note) {
	o.key("model")
	p := open(o.b)
	p.str("id", m.ID())
	p.str("edition", m.Edition())
	p.str("sha256", m.SHA256())
	o.b = p.close()
	o.key("notes")
	o.b = appendList(o.b, notes, func(p *object, n *setting.Note) {
		p.str("code", string(n.Code))
		p.str("detail", n.Text())
	})
}
