package service

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"net/http"
	"slices"
	"strconv"

	"github.com/go-json-experiment/json/jsontext"
)

// fingerprint returns the SHA-256 of a JSON text in canonical form (RFC 8785), in hexadecimal.
func fingerprint(text []byte) (string, error) {
	canonical := jsontext.Value(slices.Clone(text))
	if err := canonical.Canonicalize(); err != nil {
		return "", fmt.Errorf("a checked request has no canonical form: %w", err)
	}
	sum := sha256.Sum256(canonical)
	return hex.EncodeToString(sum[:]), nil
}

// encode returns a value as JSON, with a line end. Numbers have as few digits as read back to the same double.
func encode(value any) ([]byte, error) {
	var text bytes.Buffer
	encoder := json.NewEncoder(&text)
	encoder.SetEscapeHTML(false)
	if err := encoder.Encode(value); err != nil {
		return nil, fmt.Errorf("an answer that is not JSON: %w", err)
	}
	return text.Bytes(), nil
}

// sendJSON sends a value. Nothing is written before the whole value is text, so that a failure can still become a problem.
func sendJSON(x *exchange, status int, media string, value any) error {
	text, err := encode(value)
	if err != nil {
		return err
	}
	return send(x, status, media, text)
}

// send sends a text.
func send(x *exchange, status int, media string, text []byte) error {
	header := x.Response().Header()
	header["Content-Type"] = []string{media}
	header["Content-Length"] = []string{strconv.Itoa(len(text))}
	x.Response().WriteHeader(status)
	if x.Request().Method == http.MethodHead {
		return nil
	}
	_, err := x.Response().Write(text)
	return err
}

// sendProblem sends a refusal as a problem.
func (s *Service) sendProblem(x *exchange, r *refusal) {
	header := x.Response().Header()
	header["Cache-Control"] = noStore
	header["Content-Security-Policy"] = nothingAllowed
	if r.after > 0 {
		header.Set("Retry-After", strconv.Itoa(seconds(r.after)))
	}
	if r.close {
		header.Set("Connection", "close")
	}
	path := x.Request().URL.EscapedPath()
	if len(path) > maxNameInPlace {
		path = ""
	}
	p := r.problem(path)
	if err := sendJSON(x, p.Status, problemType, p); err != nil {
		x.Err = err
	}
}
