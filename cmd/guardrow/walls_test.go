package main

import (
	"os/exec"
	"slices"
	"strings"
	"testing"
)

// walls say what each of our packages may import, directly and outside its tests, besides the standard library: the table of
// rooms in DEVELOPERS.md. A module of others stands for its packages too.
var walls = map[string][]string{
	"guardrow/api":           {},
	"guardrow/engine":        {"guardrow/api"},
	"guardrow/engine/ems":    {"guardrow/engine"},
	"guardrow/engine/data":   {"guardrow/api", "guardrow/engine"},
	"guardrow/engine/prob":   {},
	"guardrow/engine/fit":    {"guardrow/engine", "guardrow/engine/data", "guardrow/engine/ems", "guardrow/engine/prob"},
	"guardrow/engine/answer": {"guardrow/api", "guardrow/engine", "guardrow/engine/data", "guardrow/engine/ems", "guardrow/engine/fit"},
	"guardrow/service": {
		"guardrow/api", "guardrow/engine", "guardrow/engine/answer", "guardrow/engine/data",
		"github.com/go-json-experiment/json", "github.com/labstack/echo/v4", "github.com/swaggest/swgui", "go.uber.org/zap", "go.yaml.in/yaml/v4",
	},
	"guardrow/cmd/guardrow":  {"guardrow/api", "guardrow/service", "guardrow/testdata/demo", "go.uber.org/zap"},
	"guardrow/testdata/demo": {},
}

// confined says who alone may import what of the standard library.
var confined = map[string][]string{
	"net/http":     {"guardrow/cmd/guardrow", "guardrow/service"},
	"encoding/csv": {}, // readings have a decoder of their own
}

// allowed reports whether a room may import a package.
func allowed(room, path string) bool {
	first, _, _ := strings.Cut(path, "/")
	if first == "guardrow" {
		return slices.Contains(walls[room], path)
	}
	if !strings.Contains(first, ".") {
		for name, rooms := range confined {
			if within(path, name) && !slices.Contains(rooms, room) {
				return false
			}
		}
		return true
	}
	return slices.ContainsFunc(walls[room], func(module string) bool { return within(path, module) })
}

func within(path, parent string) bool { return path == parent || strings.HasPrefix(path, parent+"/") }

func TestWalls(t *testing.T) {
	output, err := exec.CommandContext(t.Context(), "go", "list", "-f", `{{.ImportPath}} {{join .Imports " "}}`, "guardrow/...", "guardrow/testdata/demo").Output()
	if err != nil {
		t.Fatal(err)
	}
	seen := 0
	for line := range strings.Lines(string(output)) {
		fields := strings.Fields(line)
		room, imports := fields[0], fields[1:]
		if _, known := walls[room]; !known {
			t.Errorf("the room %s is not in the table of walls", room)
		}
		seen++
		for _, path := range imports {
			if !allowed(room, path) {
				t.Errorf("%s imports %s", room, path)
			}
		}
	}
	if seen != len(walls) {
		t.Errorf("%d rooms were listed, the table has %d", seen, len(walls))
	}
}

// TestTheWallsHold breaks them.
func TestTheWallsHold(t *testing.T) {
	for _, c := range []struct {
		room, path string
		allowed    bool
	}{
		{"guardrow/engine", "guardrow/api", true},
		{"guardrow/engine", "math/big", true},
		{"guardrow/engine", "guardrow/service", false},
		{"guardrow/engine/ems", "guardrow/api", false},
		{"guardrow/engine", "net/http", false},
		{"guardrow/engine", "net/http/httptrace", false},
		{"guardrow/engine/fit", "gonum.org/v1/gonum/mat", false},
		{"guardrow/engine/fit", "example.org/anything", false},
		{"guardrow/service", "github.com/labstack/echo/v4/middleware", true},
		{"guardrow/service", "github.com/labstack/echo/v5", false},
		{"guardrow/service", "github.com/getkin/kin-openapi/openapi3", false},
		{"guardrow/cmd/guardrow", "github.com/labstack/echo/v4", false},
	} {
		if got := allowed(c.room, c.path); got != c.allowed {
			t.Errorf("%s importing %s: allowed %v, want %v", c.room, c.path, got, c.allowed)
		}
	}
}

// Below the engine there is no HTTP at all, nor a logger, not even through a library.
func TestNoHTTPUnderTheEngine(t *testing.T) {
	output, err := exec.CommandContext(t.Context(), "go", "list", "-deps", "guardrow/engine/...", "guardrow/api").Output()
	if err != nil {
		t.Fatal(err)
	}
	for line := range strings.Lines(string(output)) {
		path := strings.TrimSpace(line)
		if first, _, _ := strings.Cut(path, "/"); path == "net/http" || strings.Contains(first, ".") {
			t.Errorf("the engine depends on %s", path)
		}
	}
}
