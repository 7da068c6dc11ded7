package boundary

import (
	"strings"
	"testing"
)

func TestTypeRoundTrip(t *testing.T) {
	// the spelling of model files and answers
	want := []string{
		"subduction", "spreading_ridge", "oceanic_transform", "continental_transform",
		"continental_rift", "continental_convergence", "oceanic_convergence",
	}
	if len(AllTypes) != len(want) || NumTypes != len(want)+1 {
		t.Fatalf("%d types, NumTypes %d; want %d and one more", len(AllTypes), NumTypes, len(want))
	}
	for i, typ := range AllTypes {
		if typ.String() != want[i] {
			t.Errorf("type %d is spelt %q, want %q", i, typ, want[i])
		}
		got, err := ParseType(want[i])
		if err != nil || got != typ {
			t.Errorf("ParseType(%q) = %v, %v", want[i], got, err)
		}
	}
}

func TestParseTypeErrors(t *testing.T) {
	for _, s := range []string{"", "unknown", "Subduction", "subduction ", "trench"} {
		got, err := ParseType(s)
		if err == nil || got != Unknown {
			t.Errorf("ParseType(%q) = %v, %v; want an error", s, got, err)
			continue
		}
		if !strings.Contains(err.Error(), `"`+s+`"`) || !strings.Contains(err.Error(), "oceanic_convergence") {
			t.Errorf("ParseType(%q): error %q does not name it and the types there are", s, err)
		}
	}
}

func TestTypeString(t *testing.T) {
	if got := Unknown.String(); got != "unknown" {
		t.Errorf("the zero type is spelt %q", got)
	}
	if got := Type(200).String(); got != "Type(200)" {
		t.Errorf("a type out of range is spelt %q", got)
	}
}
