package main

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"net/http"
	"os"
	"regexp"
	"strings"
	"testing"
)

// The README's request gets the README's answer, and its table of settings is that of the program.
func TestReadme(t *testing.T) {
	text, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	blocks := regexp.MustCompile("(?s)```json\n(.*?)```").FindAllStringSubmatch(string(text), -1)
	if len(blocks) != 2 {
		t.Fatalf("%d blocks of JSON, want a request and its answer", len(blocks))
	}
	address, _, stop := started(t)
	response, err := http.Post("http://"+address+"/v1/tests", "application/json", strings.NewReader(blocks[0][1]))
	if err != nil {
		t.Fatal(err)
	}
	answer, err := io.ReadAll(response.Body)
	if err != nil {
		t.Fatal(err)
	}
	if err := response.Body.Close(); err != nil {
		t.Fatal(err)
	}
	stop()
	var got, want bytes.Buffer
	if err := json.Compact(&got, answer); err != nil {
		t.Fatal(err)
	}
	if err := json.Compact(&want, []byte(blocks[1][1])); err != nil {
		t.Fatal(err)
	}
	if got.String() != want.String() {
		t.Errorf("the service answers\n%s\nthe README says\n%s", &got, &want)
	}
	for _, line := range new(settings).table() {
		row := fmt.Sprintf("| `--%s` | `%s` | %s | `%s` |\n", line.flag, line.env(), line.meaning, line.fallback)
		if !strings.Contains(string(text), row) {
			t.Errorf("the README lacks the line\n%s", row)
		}
	}
	for _, command := range []string{"go run ./cmd/guardrow demo", "go test ./..."} {
		if !strings.Contains(string(text), command) {
			t.Errorf("the README lacks the command %s", command)
		}
	}
}
