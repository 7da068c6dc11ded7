package published_test

import (
	"bufio"
	"compress/gzip"
	"errors"
	"os"
	"strconv"
	"strings"
	"testing"
)

// eachNode visits the lines of a grid.
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
		f := strings.Split(sc.Text(), ",")
		if len(f) != 3 {
			t.Fatalf("%s: %q", path, sc.Text())
		}
		lon, errLon := strconv.ParseFloat(f[0], 64)
		lat, errLat := strconv.ParseFloat(f[1], 64)
		value, errValue := strconv.ParseFloat(f[2], 64)
		if err := errors.Join(errLon, errLat, errValue); err != nil {
			t.Fatalf("%s: %q: %v", path, sc.Text(), err)
		}
		visit(lon, lat, value)
	}
	if err := sc.Err(); err != nil {
		t.Fatal(err)
	}
}
