package main

import (
	"os"
	"regexp"
	"strings"
	"testing"
	"time"

	"go.yaml.in/yaml/v4"
)

// The image and the deployment set only what the program reads, to values that it takes.
func TestDeploymentFitsTheSettings(t *testing.T) {
	image, err := os.ReadFile("../../Dockerfile")
	if err != nil {
		t.Fatal(err)
	}
	set := map[string]string{}
	for _, line := range regexp.MustCompile(`(?m)^ENV (\w+)=(\S+)$`).FindAllStringSubmatch(string(image), -1) {
		set[line[1]] = line[2]
	}
	if set["GUARDROW_LISTEN"] == "" {
		t.Error("the image does not say where to listen; the default is reached from inside only")
	}
	if !strings.Contains(string(image), "\nARG VERSION="+version+"\n") {
		t.Errorf("the image is not that of version %s", version)
	}
	text, err := os.ReadFile("../../deploy/deployment.yaml")
	if err != nil {
		t.Fatal(err)
	}
	var deployment struct {
		Spec struct {
			Template struct {
				Spec struct {
					Grace      int `yaml:"terminationGracePeriodSeconds"`
					Containers []struct {
						Image string
						Args  []string
						Env   []struct{ Name, Value string }
					}
				}
			}
		}
	}
	if err := yaml.Unmarshal(text, &deployment); err != nil {
		t.Fatal(err)
	}
	pod := deployment.Spec.Template.Spec
	if len(pod.Containers) != 1 || len(pod.Containers[0].Env) == 0 {
		t.Fatalf("read %+v", pod)
	}
	if image := pod.Containers[0].Image; image != "guardrow:"+version {
		t.Errorf("the deployment runs %s, this is version %s", image, version)
	}
	for _, e := range pod.Containers[0].Env {
		set[e.Name] = e.Value
	}
	known := map[string]bool{}
	for _, line := range new(settings).table() {
		known[line.env()] = true
	}
	for name := range set {
		if strings.HasPrefix(name, "GUARDROW_") && !known[name] {
			t.Errorf("%s is no setting", name)
		}
	}
	var s settings
	if err := s.read(pod.Containers[0].Args[0], pod.Containers[0].Args[1:], func(name string) string { return set[name] }, nil); err != nil {
		t.Error(err)
	}
	if needed := s.drainTime + s.stopTime + answerTime; time.Duration(pod.Grace)*time.Second <= needed {
		t.Errorf("the pod is killed after %d s, the process may need %v", pod.Grace, needed)
	}
}
