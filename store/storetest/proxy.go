package storetest

import (
	"io"
	"net"
	"sync"
)

// proxy passes connections on to a server, and can cut them or hold them up.
type proxy struct {
	target   string
	listener net.Listener
	mu       sync.Mutex
	down     bool
	open     map[net.Conn]bool
	held     sync.RWMutex // for writing while nothing is to pass
}

// held is a reader whose bytes wait while the proxy holds them up.
type held struct {
	net.Conn
	p *proxy
}

func (h held) Read(b []byte) (int, error) {
	n, err := h.Conn.Read(b)
	h.p.held.RLock()
	defer h.p.held.RUnlock()
	return n, err
}

func (p *proxy) hold()  { p.held.Lock() }
func (p *proxy) letGo() { p.held.Unlock() }

func newProxy(target string) (*proxy, error) {
	if _, _, err := net.SplitHostPort(target); err != nil {
		target = net.JoinHostPort(target, "5432")
	}
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		return nil, err
	}
	p := &proxy{target: target, listener: l, open: map[net.Conn]bool{}}
	go p.serve()
	return p, nil
}

func (p *proxy) address() string { return p.listener.Addr().String() }

func (p *proxy) serve() {
	for {
		c, err := p.listener.Accept()
		if err != nil {
			return
		}
		go p.pass(c)
	}
}

// keep notes a connection, or closes it where the proxy is cut.
func (p *proxy) keep(c net.Conn) bool {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.down {
		_ = c.Close()
		return false
	}
	p.open[c] = true
	return true
}

func (p *proxy) pass(c net.Conn) {
	if !p.keep(c) {
		return
	}
	s, err := net.Dial("tcp", p.target)
	if err != nil || !p.keep(s) {
		_ = c.Close()
		return
	}
	done := make(chan struct{}, 2)
	for _, x := range [...][2]net.Conn{{c, s}, {s, c}} {
		go func() {
			_, _ = io.Copy(x[0], held{x[1], p}) // a cut is what the test wants
			done <- struct{}{}
		}()
	}
	<-done
	_ = c.Close()
	_ = s.Close()
	p.mu.Lock()
	delete(p.open, c)
	delete(p.open, s)
	p.mu.Unlock()
}

func (p *proxy) cut() {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.down = true
	for c := range p.open {
		_ = c.Close()
	}
}

func (p *proxy) mend() {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.down = false
}
