// Command sbom writes what a program is made of as a CycloneDX document: every Go
// module that is linked into it, by the program's own build information, the standard
// library, and the files that its map page brings along, each with version and
// licence. The same program gives the same bytes.
//
//	sbom PROGRAM > PROGRAM.cdx.json
package main

import (
	"crypto/sha256"
	"debug/buildinfo"
	"encoding/hex"
	"fmt"
	"io"
	"net/url"
	"os"
	"runtime/debug"
	"strings"

	cdx "github.com/CycloneDX/cyclonedx-go"
	"github.com/google/uuid"

	"nearmargin/deploy/licences"
)

func main() {
	if err := run(os.Args[1:], os.Stdout); err != nil {
		fmt.Fprintf(os.Stderr, "sbom: %v\n", err)
		os.Exit(1)
	}
}

func run(args []string, out io.Writer) error {
	if len(args) != 1 {
		return fmt.Errorf("%d arguments; want one, the program", len(args))
	}
	raw, err := os.ReadFile(args[0]) // #nosec G703 -- the program that was built, by whoever built it
	if err != nil {
		return err
	}
	info, err := buildinfo.ReadFile(args[0])
	if err != nil {
		return err
	}
	bom, err := document(info, sha256.Sum256(raw))
	if err != nil {
		return err
	}
	return cdx.NewBOMEncoder(out, cdx.BOMFileFormatJSON).SetPretty(true).EncodeVersion(bom, cdx.SpecVersion1_6)
}

// vendored are the files below api/page/static/vendor, which no module brings.
var vendored = []struct{ name, version, licence string }{
	{"d3", "7.9.2", "ISC"},
	{"topojson-client", "3.1.0", "ISC"},
	{"world-atlas", "2.0.2", "ISC"},
}

// document describes a program of a build information and a checksum. A module that
// the list of licences does not have is an error.
func document(info *debug.BuildInfo, sum [sha256.Size]byte) (*cdx.BOM, error) {
	main := component(cdx.ComponentTypeApplication, info.Main.Path, info.Main.Version, "Apache-2.0", golang(info.Main.Path, info.Main.Version))
	main.Hashes = &[]cdx.Hash{{Algorithm: cdx.HashAlgoSHA256, Value: hex.EncodeToString(sum[:])}}
	main.Properties = &[]cdx.Property{}
	for _, s := range info.Settings {
		*main.Properties = append(*main.Properties, cdx.Property{Name: "nearmargin:build:" + s.Key, Value: s.Value})
	}
	std := component(cdx.ComponentTypeLibrary, "std", info.GoVersion, "BSD-3-Clause", golang("std", strings.TrimPrefix(info.GoVersion, "go")))
	list := []cdx.Component{std}
	for _, m := range info.Deps {
		if m.Replace != nil {
			m = m.Replace
		}
		licence := licences.Of(m.Path, m.Version)
		if licence == "" {
			return nil, fmt.Errorf("deploy/licences has no %s %s; see its test for how to bring the list up to date", m.Path, m.Version)
		}
		c := component(cdx.ComponentTypeLibrary, m.Path, m.Version, licence, golang(m.Path, m.Version))
		c.Properties = &[]cdx.Property{{Name: "nearmargin:go.sum", Value: m.Sum}}
		list = append(list, c)
	}
	for _, v := range vendored {
		list = append(list, component(cdx.ComponentTypeLibrary, v.name, v.version, v.licence, "pkg:npm/"+v.name+"@"+v.version))
	}
	bom := cdx.NewBOM()
	bom.SerialNumber = uuid.NewSHA1(uuid.NameSpaceOID, sum[:]).URN() // one program, one document
	bom.Metadata = &cdx.Metadata{Component: &main}
	bom.Components = &list
	return bom, nil
}

func component(kind cdx.ComponentType, name, version, licence, purl string) cdx.Component {
	return cdx.Component{
		BOMRef: purl, Type: kind, Name: name, Version: version, PackageURL: purl,
		Licenses: &cdx.Licenses{{License: &cdx.License{ID: licence}}},
	}
}

// golang returns a module's package URL, of which path and name are in lower case.
func golang(path, version string) string {
	return "pkg:golang/" + strings.ToLower(path) + "@" + strings.ReplaceAll(url.PathEscape(version), "+", "%2B")
}
