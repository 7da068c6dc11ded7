package deploy

import (
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// TestDockerfile: the image has nothing but the program, and runs it as nobody.
func TestDockerfile(t *testing.T) {
	raw, err := os.ReadFile("Dockerfile.static")
	if err != nil {
		t.Fatal(err)
	}
	text := string(raw)
	for _, want := range []string{"\nFROM scratch\n", "\nUSER 65532:65532\n", "HEALTHCHECK", `"/nearmargin", "health", "http://127.0.0.1:8080/readyz"`, `ENTRYPOINT ["/nearmargin"]`} {
		if !strings.Contains(text, want) {
			t.Errorf("the Dockerfile lacks %q", want)
		}
	}
	if n := len(regexp.MustCompile(`(?m)^(RUN|ADD|COPY) `).FindAllString(text, -1)); n != 1 {
		t.Errorf("%d instructions put something into the image, want 1", n)
	}
}

// TestUnit checks the systemd unit by systemd's own tool, where it is installed.
func TestUnit(t *testing.T) {
	raw, err := os.ReadFile("systemd/nearmargin.service")
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"NoNewPrivileges=yes", "ProtectSystem=strict", "DynamicUser=yes", "CapabilityBoundingSet=\n", "ExecReload=/bin/kill -HUP $MAINPID\n", "ExecStart=/usr/local/bin/nearmargin serve\n"} {
		if !strings.Contains(string(raw), want) {
			t.Errorf("the unit lacks %q", want)
		}
	}
	tool, err := exec.LookPath("systemd-analyze")
	if err != nil {
		t.Skip("systemd-analyze is not installed")
	}
	path := filepath.Join(t.TempDir(), "nearmargin.service")
	unit := strings.ReplaceAll(string(raw), "/usr/local/bin/nearmargin", "/bin/true")
	if err := os.WriteFile(path, []byte(unit), 0o600); err != nil {
		t.Fatal(err)
	}
	if out, err := exec.Command(tool, "verify", path).CombinedOutput(); err != nil || strings.Contains(string(out), "nearmargin.service:") {
		t.Errorf("%v: %s", err, out)
	}
}

// TestBuildIsReproducible builds the program and the list of its components twice,
// into two folders, and compares the bytes.
func TestBuildIsReproducible(t *testing.T) {
	if testing.Short() {
		t.Skip("builds the program twice")
	}
	var sums [2]string
	for i := range sums {
		dir := t.TempDir()
		cmd := exec.Command("sh", "./build", dir, "linux/amd64")
		cmd.Env = append(os.Environ(), "BUILDVCS=false", "GOTMPDIR="+t.TempDir())
		out, err := cmd.Output()
		if err != nil {
			t.Fatalf("%v: %s", err, out)
		}
		for line := range strings.Lines(string(out)) {
			sums[i] += strings.Fields(line)[0] + "\n"
		}
		if i == 0 {
			checkSBOM(t, filepath.Join(dir, "linux_amd64", "nearmargin"))
		}
	}
	if sums[0] != sums[1] || strings.Count(sums[0], "\n") != 2 {
		t.Errorf("two builds, two results:\n%s\n%s", sums[0], sums[1])
	}
}
