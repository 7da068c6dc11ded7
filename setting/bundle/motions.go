package bundle

import (
	"fmt"
	"math"
	"slices"

	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// The forms in which a table may give an angular velocity.
var (
	poleColumns       = []string{"plate", "lat_deg", "lon_deg", "rate_deg_myr", "rate_sigma_deg_myr", "basis"}
	cartesianColumns  = []string{"plate", "wx_mas_yr", "wy_mas_yr", "wz_mas_yr", "sx_mas_yr", "sy_mas_yr", "sz_mas_yr", "basis"}
	covarianceColumns = []string{"plate", "wx_mas_yr", "wy_mas_yr", "wz_mas_yr", "cxx", "cxy", "cxz", "cyy", "cyz", "czz", "basis"} // (mas/yr)²
)

func motionFile(name string) string { return "motion/" + name + ".csv" }

// readMotion reads a motion model's table, in whichever form it is.
func readMotion(info motion.Info, raw []byte) (*motion.Model, *table, error) {
	file := motionFile(info.Name)
	t, err := readAnyTable(file, raw)
	if err != nil {
		return nil, nil, err
	}
	var read func(*table, int) (sphere.Vec, motion.Spread, error)
	switch {
	case slices.Equal(t.header, poleColumns):
		read = readPole
	case slices.Equal(t.header, cartesianColumns):
		read = readCartesian
	case slices.Equal(t.header, covarianceColumns):
		read = readCovariance
	default:
		return nil, nil, fault(file, 1, "the columns are %v; they must be %v, %v or %v", t.header, poleColumns, cartesianColumns, covarianceColumns)
	}
	var entries []motion.Entry
	for i := range t.rows {
		w, spread, err := read(t, i)
		if err != nil {
			return nil, nil, err
		}
		entries = append(entries, motion.Entry{Plate: t.cell(i, "plate"), Vector: w, Spread: spread, Basis: t.cell(i, "basis")})
	}
	m, err := motion.NewModel(info, entries)
	if err != nil {
		return nil, nil, &FileError{File: file, Err: err}
	}
	return m, t, nil
}

func readPole(t *table, i int) (sphere.Vec, motion.Spread, error) {
	n, err := t.numbers(i, "lat_deg", "lon_deg", "rate_deg_myr")
	if err != nil {
		return sphere.Vec{}, motion.Spread{}, err
	}
	if math.Abs(n[0]) > 90 || math.Abs(n[1]) > 360 {
		return sphere.Vec{}, motion.Spread{}, t.fault(i, "lat_deg %g and lon_deg %g are no position", n[0], n[1])
	}
	w := motion.Pole{Lat: n[0], Lon: n[1], RateDegMyr: n[2]}.Vector()
	if t.cell(i, "rate_sigma_deg_myr") == "" {
		return w, motion.NoSpread(), nil
	}
	sigma, err := t.number(i, "rate_sigma_deg_myr")
	if err != nil {
		return w, motion.Spread{}, err
	}
	spread, err := motion.RateSpread(sigma, n[2])
	if err != nil {
		return w, spread, t.fault(i, "%v", err)
	}
	return w, spread, nil
}

func readCartesian(t *table, i int) (sphere.Vec, motion.Spread, error) {
	n, err := t.numbers(i, "wx_mas_yr", "wy_mas_yr", "wz_mas_yr", "sx_mas_yr", "sy_mas_yr", "sz_mas_yr")
	if err != nil {
		return sphere.Vec{}, motion.Spread{}, err
	}
	spread, err := motion.ComponentSpread(motion.FromMasYr(n[3], n[4], n[5]))
	if err != nil {
		return sphere.Vec{}, spread, t.fault(i, "%v", err)
	}
	return motion.FromMasYr(n[0], n[1], n[2]), spread, nil
}

func readCovariance(t *table, i int) (sphere.Vec, motion.Spread, error) {
	n, err := t.numbers(i, "wx_mas_yr", "wy_mas_yr", "wz_mas_yr", "cxx", "cxy", "cxz", "cyy", "cyz", "czz")
	if err != nil {
		return sphere.Vec{}, motion.Spread{}, err
	}
	unit := motion.FromMasYr(1, 0, 0).X // rad/Myr in one mas/yr
	c := n[3:]
	for k := range c {
		c[k] *= unit * unit
	}
	spread, err := motion.CovarianceSpread([3][3]float64{{c[0], c[1], c[2]}, {c[1], c[3], c[4]}, {c[2], c[4], c[5]}})
	if err != nil {
		return sphere.Vec{}, spread, t.fault(i, "%v", err)
	}
	return motion.FromMasYr(n[0], n[1], n[2]), spread, nil
}

// checkMotionName refuses a name that could leave the directory.
func checkMotionName(name string) error {
	if !nameForm.MatchString(name) {
		return fmt.Errorf("motion model name %q must be lower-case letters, digits and hyphens", name)
	}
	return nil
}
