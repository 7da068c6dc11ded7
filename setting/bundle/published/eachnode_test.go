package published_test

import (
	"bufio"
	"compress/gzip"
	"fmt"
	"math"
	"os"
	"strings"
	"testing"
)

// eachNode visits the lines of a grid by another way than the reader's.
func eachNode(t *testing.T, path string, visit func(lon, lat, value float64)) {
	t.Helper()
	in, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer in.Close()
	z, err := gzip.NewReader(bufio.NewReader(in))
	if err != nil {
		t.Fatal(err)
	}
	sc := bufio.NewScanner(z)
	for sc.Scan() {
		var lon, lat, value float64
		line := sc.Text()
		if text, ok := strings.CutSuffix(strings.ToLower(line), "nan"); ok {
			line, value = text+"0", math.NaN()
		}
		var x float64
		if _, err := fmt.Sscanf(strings.ReplaceAll(line, ",", " "), "%g %g %g", &lon, &lat, &x); err != nil {
			t.Fatalf("%s: %q: %v", path, line, err)
		}
		if !math.IsNaN(value) {
			value = x
		}
		visit(lon, lat, value)
	}
	if err := sc.Err(); err != nil {
		t.Fatal(err)
	}
}
