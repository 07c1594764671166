package main

import (
	"os/exec"
	"slices"
	"strings"
	"testing"
)

// walls say which of our packages each may import, directly, outside its tests (DEVELOPERS.md).
var walls = map[string][]string{
	"guardrow/api":           {},
	"guardrow/engine":        {"guardrow/api"},
	"guardrow/engine/ems":    {"guardrow/engine"},
	"guardrow/engine/data":   {"guardrow/api", "guardrow/engine"},
	"guardrow/engine/prob":   {},
	"guardrow/engine/fit":    {"guardrow/engine", "guardrow/engine/data", "guardrow/engine/ems", "guardrow/engine/prob"},
	"guardrow/engine/answer": {"guardrow/api", "guardrow/engine", "guardrow/engine/data", "guardrow/engine/ems", "guardrow/engine/fit"},
	"guardrow/service":       {"guardrow/api", "guardrow/engine", "guardrow/engine/answer", "guardrow/engine/data"},
	"guardrow/cmd/guardrow":  {"guardrow/api", "guardrow/service", "guardrow/testdata/demo"},
}

// confined says who alone may import, directly, what comes from outside.
var confined = map[string][]string{
	"github.com/labstack/echo/v4":   {"guardrow/service"},
	"github.com/getkin/kin-openapi": {},
	"github.com/go-json-experiment": {"guardrow/service"},
	"github.com/swaggest/swgui":     {"guardrow/service"},
	"go.uber.org/zap":               {"guardrow/cmd/guardrow", "guardrow/service"},
	"go.yaml.in/yaml":               {"guardrow/service"},
	"gonum.org/v1/gonum":            {"guardrow/engine/fit", "guardrow/engine/prob"},
	"github.com/santhosh-tekuri":    {},
	"net/http":                      {"guardrow/cmd/guardrow", "guardrow/service"},
	"encoding/csv":                  {},
}

func TestWalls(t *testing.T) {
	output, err := exec.CommandContext(t.Context(), "go", "list", "-f", `{{.ImportPath}} {{join .Imports " "}}`, "guardrow/...").Output()
	if err != nil {
		t.Fatal(err)
	}
	seen := 0
	for line := range strings.Lines(string(output)) {
		fields := strings.Fields(line)
		room, imports := fields[0], fields[1:]
		allowed, known := walls[room]
		if !known {
			t.Errorf("the room %s is not in the table of walls", room)
		}
		seen++
		for _, path := range imports {
			if path == "guardrow" || strings.HasPrefix(path, "guardrow/") {
				if !slices.Contains(allowed, path) {
					t.Errorf("%s imports %s", room, path)
				}
				continue
			}
			for outside, rooms := range confined {
				if (path == outside || strings.HasPrefix(path, outside+"/")) && !slices.Contains(rooms, room) {
					t.Errorf("%s imports %s", room, path)
				}
			}
		}
	}
	if seen != len(walls) {
		t.Errorf("%d rooms were listed, the table has %d", seen, len(walls))
	}
}

// Below the engine there is no HTTP at all, not even through a library.
func TestNoHTTPUnderTheEngine(t *testing.T) {
	output, err := exec.CommandContext(t.Context(), "go", "list", "-deps", "guardrow/engine/...", "guardrow/api").Output()
	if err != nil {
		t.Fatal(err)
	}
	for line := range strings.Lines(string(output)) {
		if path := strings.TrimSpace(line); path == "net/http" || strings.HasPrefix(path, "github.com/labstack/") || strings.HasPrefix(path, "go.uber.org/") {
			t.Errorf("the engine depends on %s", path)
		}
	}
}
