package deploy

import (
	"bytes"
	"errors"
	"io"
	"maps"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"go.yaml.in/yaml/v3"
)

// The manifests are decoded strictly into these structs. They hold the fields
// that the manifests use, by their names in the Kubernetes API reference, v1.33
// (names from memory); a field of another name, or at another place, is a fault.
type (
	labels map[string]string
	meta   struct {
		Name                string
		Labels, Annotations labels
	}
	selector struct {
		MatchLabels labels `yaml:"matchLabels"`
	}
	header struct {
		APIVersion string `yaml:"apiVersion"`
		Kind       string
		Metadata   meta
	}
	podTemplate struct {
		Metadata meta
		Spec     podSpec
	}
	podSpec struct {
		AutomountServiceAccountToken  *bool  `yaml:"automountServiceAccountToken"`
		TerminationGracePeriodSeconds int    `yaml:"terminationGracePeriodSeconds"`
		RestartPolicy                 string `yaml:"restartPolicy"`
		SecurityContext               struct {
			RunAsNonRoot   bool                  `yaml:"runAsNonRoot"`
			RunAsUser      int                   `yaml:"runAsUser"`
			RunAsGroup     int                   `yaml:"runAsGroup"`
			FSGroup        int                   `yaml:"fsGroup"`
			SeccompProfile struct{ Type string } `yaml:"seccompProfile"`
		} `yaml:"securityContext"`
		TopologySpreadConstraints []struct {
			MaxSkew           int      `yaml:"maxSkew"`
			TopologyKey       string   `yaml:"topologyKey"`
			WhenUnsatisfiable string   `yaml:"whenUnsatisfiable"`
			LabelSelector     selector `yaml:"labelSelector"`
		} `yaml:"topologySpreadConstraints"`
		Containers []container
		Volumes    []struct {
			Name                  string
			PersistentVolumeClaim struct {
				ClaimName string `yaml:"claimName"`
			} `yaml:"persistentVolumeClaim"`
		}
	}
	container struct {
		Name, Image string
		Args        []string
		Env         []struct {
			Name, Value string
			ValueFrom   struct {
				SecretKeyRef struct {
					Name, Key string
					Optional  bool
				} `yaml:"secretKeyRef"`
				FieldRef struct {
					FieldPath string `yaml:"fieldPath"`
				} `yaml:"fieldRef"`
			} `yaml:"valueFrom"`
		}
		Ports []struct {
			Name          string
			ContainerPort int `yaml:"containerPort"`
		}
		StartupProbe   *probe `yaml:"startupProbe"`
		ReadinessProbe *probe `yaml:"readinessProbe"`
		LivenessProbe  *probe `yaml:"livenessProbe"`
		Resources      struct{ Requests, Limits labels }
		VolumeMounts   []struct {
			Name      string
			MountPath string `yaml:"mountPath"`
		} `yaml:"volumeMounts"`
		SecurityContext struct {
			AllowPrivilegeEscalation *bool `yaml:"allowPrivilegeEscalation"`
			ReadOnlyRootFilesystem   bool  `yaml:"readOnlyRootFilesystem"`
			Capabilities             struct{ Drop []string }
		} `yaml:"securityContext"`
	}
	probe struct {
		HTTPGet          struct{ Path, Port string } `yaml:"httpGet"`
		PeriodSeconds    int                         `yaml:"periodSeconds"`
		TimeoutSeconds   int                         `yaml:"timeoutSeconds"`
		FailureThreshold int                         `yaml:"failureThreshold"`
	}
	deployment struct {
		header `yaml:",inline"`
		Spec   struct {
			Replicas int
			Selector selector
			Strategy struct {
				Type          string
				RollingUpdate struct {
					MaxUnavailable int `yaml:"maxUnavailable"`
					MaxSurge       int `yaml:"maxSurge"`
				} `yaml:"rollingUpdate"`
			}
			Template podTemplate
		}
	}
	autoscaler struct {
		header `yaml:",inline"`
		Spec   struct {
			ScaleTargetRef struct {
				APIVersion string `yaml:"apiVersion"`
				Kind, Name string
			} `yaml:"scaleTargetRef"`
			MinReplicas int `yaml:"minReplicas"`
			MaxReplicas int `yaml:"maxReplicas"`
			Metrics     []struct {
				Type     string
				Resource struct {
					Name   string
					Target struct {
						Type               string
						AverageUtilization int `yaml:"averageUtilization"`
					}
				}
			}
			Behavior struct {
				ScaleDown struct {
					StabilizationWindowSeconds int `yaml:"stabilizationWindowSeconds"`
				} `yaml:"scaleDown"`
			}
		}
	}
	disruptionBudget struct {
		header `yaml:",inline"`
		Spec   struct {
			MinAvailable int `yaml:"minAvailable"`
			Selector     selector
		}
	}
	service struct {
		header `yaml:",inline"`
		Spec   struct {
			Selector labels
			Ports    []struct {
				Name       string
				Port       int
				TargetPort string `yaml:"targetPort"`
			}
		}
	}
	networkPolicy struct {
		header `yaml:",inline"`
		Spec   struct {
			PodSelector selector `yaml:"podSelector"`
			PolicyTypes []string `yaml:"policyTypes"`
			Ingress     []struct {
				From []struct {
					NamespaceSelector selector `yaml:"namespaceSelector"`
				}
				Ports []struct {
					Protocol string
					Port     int
				}
			}
			Egress []any
		}
	}
	job struct {
		header `yaml:",inline"`
		Spec   struct {
			CompletionMode       string `yaml:"completionMode"`
			Completions          int
			Parallelism          int
			BackoffLimitPerIndex int `yaml:"backoffLimitPerIndex"`
			PodFailurePolicy     struct {
				Rules []struct {
					Action      string
					OnExitCodes struct {
						ContainerName string `yaml:"containerName"`
						Operator      string
						Values        []int
					} `yaml:"onExitCodes"`
					OnPodConditions []struct{ Type, Status string } `yaml:"onPodConditions"`
				}
			} `yaml:"podFailurePolicy"`
			TTLSecondsAfterFinished int `yaml:"ttlSecondsAfterFinished"`
			Template                podTemplate
		}
	}
)

// kinds are the kinds there are, by API version and kind.
var kinds = map[string]func() any{
	"apps/v1 Deployment":                     func() any { return new(deployment) },
	"autoscaling/v2 HorizontalPodAutoscaler": func() any { return new(autoscaler) },
	"policy/v1 PodDisruptionBudget":          func() any { return new(disruptionBudget) },
	"v1 Service":                             func() any { return new(service) },
	"networking.k8s.io/v1 NetworkPolicy":     func() any { return new(networkPolicy) },
	"batch/v1 Job":                           func() any { return new(job) },
}

// strict decodes all of one document.
func strict(raw []byte, into any) error {
	d := yaml.NewDecoder(bytes.NewReader(raw))
	d.KnownFields(true)
	return d.Decode(into)
}

// decodeManifests decodes the documents of a file, by kind.
func decodeManifests(raw []byte) (map[string]any, error) {
	out := map[string]any{}
	d := yaml.NewDecoder(bytes.NewReader(raw))
	for {
		var n yaml.Node
		if err := d.Decode(&n); err == io.EOF {
			return out, nil
		} else if err != nil {
			return nil, err
		}
		var h struct {
			APIVersion string `yaml:"apiVersion"`
			Kind       string
		}
		if err := n.Decode(&h); err != nil {
			return nil, err
		}
		make, ok := kinds[h.APIVersion+" "+h.Kind]
		if !ok {
			return nil, errors.New("no such kind: " + h.APIVersion + " " + h.Kind)
		}
		one, err := yaml.Marshal(&n)
		if err != nil {
			return nil, err
		}
		v := make()
		if err := strict(one, v); err != nil {
			return nil, err
		}
		out[h.Kind] = v
	}
}

func manifests(t *testing.T, file string) map[string]any {
	t.Helper()
	raw, err := os.ReadFile(filepath.Join("kubernetes", file))
	if err != nil {
		t.Fatal(err)
	}
	m, err := decodeManifests(raw)
	if err != nil {
		t.Fatalf("%s: %v", file, err)
	}
	return m
}

// TestServiceManifests checks that the objects fit together.
func TestServiceManifests(t *testing.T) {
	m := manifests(t, "service.yaml")
	d := m["Deployment"].(*deployment)
	pod := d.Spec.Template
	same := func(what string, got labels) {
		t.Helper()
		if !maps.Equal(got, pod.Metadata.Labels) || len(got) == 0 {
			t.Errorf("%s selects %v, the pods have %v", what, got, pod.Metadata.Labels)
		}
	}
	same("deployment", d.Spec.Selector.MatchLabels)
	same("budget", m["PodDisruptionBudget"].(*disruptionBudget).Spec.Selector.MatchLabels)
	same("service", m["Service"].(*service).Spec.Selector)
	same("policy", m["NetworkPolicy"].(*networkPolicy).Spec.PodSelector.MatchLabels)
	same("spread", pod.Spec.TopologySpreadConstraints[0].LabelSelector.MatchLabels)
	if target := m["HorizontalPodAutoscaler"].(*autoscaler).Spec.ScaleTargetRef; target.Name != d.Metadata.Name || target.Kind != d.Kind || target.APIVersion != d.APIVersion {
		t.Errorf("the autoscaler aims at %+v", target)
	}
	if budget, least := m["PodDisruptionBudget"].(*disruptionBudget).Spec.MinAvailable, m["HorizontalPodAutoscaler"].(*autoscaler).Spec.MinReplicas; budget >= least {
		t.Errorf("a budget of %d lets no pod of %d be moved", budget, least)
	}
	c := pod.Spec.Containers[0]
	ports, numbers := map[string]bool{}, map[int]bool{}
	for _, p := range c.Ports {
		ports[p.Name], numbers[p.ContainerPort] = true, true
	}
	for path, p := range map[string]*probe{"/readyz": c.ReadinessProbe, "/healthz": c.LivenessProbe} {
		if p == nil || p.HTTPGet.Path != path || !ports[p.HTTPGet.Port] {
			t.Errorf("probe of %s: %+v", path, p)
		}
	}
	if !ports[m["Service"].(*service).Spec.Ports[0].TargetPort] {
		t.Error("the service leads to no port")
	}
	for _, in := range m["NetworkPolicy"].(*networkPolicy).Spec.Ingress {
		for _, p := range in.Ports {
			if !numbers[p.Port] {
				t.Errorf("the policy opens port %d, which nobody listens on", p.Port)
			}
			if p.Port == 9090 && len(in.From) == 0 {
				t.Error("the private port is open to all")
			}
		}
	}
	env := map[string]string{}
	for _, e := range c.Env {
		env[e.Name] = e.Value
	}
	var stop time.Duration
	for _, name := range []string{"NEARMARGIN_DRAIN_TIME", "NEARMARGIN_SHUTDOWN_TIMEOUT"} {
		x, err := time.ParseDuration(env[name])
		if err != nil {
			t.Fatal(err)
		}
		stop += x
	}
	if grace := time.Duration(pod.Spec.TerminationGracePeriodSeconds) * time.Second; grace < stop+4*time.Second { // what is cut short, and the last traces
		t.Errorf("pods are killed after %v and need %v to stop", grace, stop+4*time.Second)
	}
	if period := c.ReadinessProbe.PeriodSeconds * c.ReadinessProbe.FailureThreshold; env["NEARMARGIN_DRAIN_TIME"] != "10s" || period >= 10 {
		t.Errorf("a drain of %s is shorter than the %d s after which readiness counts as off", env["NEARMARGIN_DRAIN_TIME"], period)
	}
	checkHardened(t, pod.Spec)
	checkEnvironment(t, env)
}

// checkHardened sees to it that a pod runs with no more rights than it needs.
func checkHardened(t *testing.T, p podSpec) {
	t.Helper()
	s, c := p.SecurityContext, p.Containers[0].SecurityContext
	if !s.RunAsNonRoot || s.RunAsUser == 0 || s.SeccompProfile.Type != "RuntimeDefault" || p.AutomountServiceAccountToken == nil || *p.AutomountServiceAccountToken {
		t.Errorf("pod: %+v", s)
	}
	if c.AllowPrivilegeEscalation == nil || *c.AllowPrivilegeEscalation || !c.ReadOnlyRootFilesystem || len(c.Capabilities.Drop) != 1 || c.Capabilities.Drop[0] != "ALL" {
		t.Errorf("container: %+v", c)
	}
	if p.Containers[0].Resources.Limits["memory"] == "" || p.Containers[0].Resources.Requests["cpu"] == "" {
		t.Error("no memory limit or no processor request")
	}
}

// checkEnvironment has the program itself read an environment.
func checkEnvironment(t *testing.T, env map[string]string) {
	t.Helper()
	cmd := exec.Command("go", "run", "../cmd/nearmargin", "serve", "--check-config")
	cmd.Env = os.Environ()
	for k, v := range env {
		cmd.Env = append(cmd.Env, k+"="+v)
	}
	out, err := cmd.CombinedOutput()
	if err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	for k, v := range env {
		d, err := time.ParseDuration(v)
		if err == nil {
			v = d.String()
		}
		if !strings.Contains("\n"+string(out), "\n"+k+"="+v+"\n") {
			t.Errorf("%s=%s is not in effect:\n%s", k, v, out)
		}
	}
}

func TestJobManifest(t *testing.T) {
	j := manifests(t, "annotate-job.yaml")["Job"].(*job)
	s := j.Spec
	if s.CompletionMode != "Indexed" || s.Parallelism > s.Completions || s.BackoffLimitPerIndex < 1 || s.Template.Spec.RestartPolicy != "Never" {
		t.Errorf("job: %+v", s)
	}
	c := s.Template.Spec.Containers[0]
	if len(c.Env) != 1 || c.Env[0].Name != "INDEX" || c.Env[0].ValueFrom.FieldRef.FieldPath != "metadata.annotations['batch.kubernetes.io/job-completion-index']" {
		t.Errorf("the index comes from %+v", c.Env)
	}
	for _, name := range []string{"/data/in/part-$(INDEX).csv", "/data/out/part-$(INDEX).csv"} {
		if !strings.Contains(strings.Join(c.Args, " "), name) {
			t.Errorf("%s is not in %v", name, c.Args)
		}
	}
	if c.Args[0] != "annotate" || c.VolumeMounts[0].Name != s.Template.Spec.Volumes[0].Name || !strings.HasPrefix("/data/in", c.VolumeMounts[0].MountPath) {
		t.Errorf("%v with %+v", c.Args, c.VolumeMounts)
	}
	if r := s.PodFailurePolicy.Rules[0]; r.OnExitCodes.ContainerName != c.Name || r.Action != "FailIndex" {
		t.Errorf("rule %+v", r)
	}
	checkHardened(t, s.Template.Spec)
}

// TestStrictDecoder: a decoder that lets everything pass would prove nothing.
func TestStrictDecoder(t *testing.T) {
	raw, err := os.ReadFile("kubernetes/service.yaml")
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ name, from, to string }{
		{"a misspelt field", "readinessProbe:", "readynessProbe:"},
		{"a field at another place", "          resources:", "          replicas: 2\n          resources:"},
		{"text for a number", "replicas: 2", "replicas: two"},
		{"a field twice", "  replicas: 2", "  replicas: 2\n  replicas: 3"},
		{"an old version", "policy/v1", "policy/v1beta1"},
	} {
		t.Run(c.name, func(t *testing.T) {
			bad := strings.Replace(string(raw), c.from, c.to, 1)
			if bad == string(raw) {
				t.Fatal("nothing is changed")
			}
			if _, err := decodeManifests([]byte(bad)); err == nil {
				t.Error("it passes")
			}
		})
	}
}
