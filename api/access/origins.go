package access

import (
	"fmt"
	"net"
	"net/netip"
	"net/url"
	"strings"
)

// Origins are the web origins whose pages may ask.
type Origins struct {
	all  bool
	list map[string]bool
}

// ParseOrigins reads origins between commas, such as https://maps.example.org; a
// single * allows all. Empty text allows none.
func ParseOrigins(text string) (*Origins, error) {
	o := &Origins{list: map[string]bool{}}
	for s := range strings.SplitSeq(text, ",") {
		s = strings.TrimSpace(s)
		switch {
		case s == "":
			continue
		case s == "*":
			o.all = true
			continue
		}
		u, err := url.Parse(s)
		if err != nil || u.Scheme != "http" && u.Scheme != "https" || u.Host == "" || u.Scheme+"://"+u.Host != s {
			return nil, fmt.Errorf("origin %.80q is not scheme://host[:port] in lower case, such as https://maps.example.org", s)
		}
		o.list[s] = true
	}
	return o, nil
}

// Any reports whether any origin is allowed.
func (o *Origins) Any() bool { return o != nil && (o.all || len(o.list) > 0) }

// Allow returns the value of Access-Control-Allow-Origin for an origin.
func (o *Origins) Allow(origin string) (string, bool) {
	switch {
	case o == nil || origin == "":
		return "", false
	case o.all:
		return "*", true
	}
	return origin, o.list[origin]
}

// ParseProxies reads the addresses or networks of proxies between commas.
func ParseProxies(text string) ([]*net.IPNet, error) {
	var out []*net.IPNet
	for s := range strings.SplitSeq(text, ",") {
		s = strings.TrimSpace(s)
		if s == "" {
			continue
		}
		p, err := netip.ParsePrefix(s)
		if err != nil {
			a, err := netip.ParseAddr(s)
			if err != nil || a.Zone() != "" {
				return nil, fmt.Errorf("proxy %.80q is neither an address nor a network such as 10.0.0.0/8", s)
			}
			p = netip.PrefixFrom(a, a.BitLen())
		}
		if p.Bits() == 0 {
			return nil, fmt.Errorf("proxy %s would believe every client; name the proxies", s)
		}
		out = append(out, &net.IPNet{IP: p.Masked().Addr().AsSlice(), Mask: net.CIDRMask(p.Bits(), p.Addr().BitLen())})
	}
	return out, nil
}
