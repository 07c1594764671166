package service

import (
	"bytes"
	"crypto/sha256"
	"encoding/base64"
	"encoding/hex"
	"errors"
	"net/http"
	"net/url"
	"regexp"
	"strings"
	"time"

	"guardrow/api"

	"github.com/swaggest/swgui/v5emb"
)

// contract serves the contract itself, the page to read it, and the catalogue of problems. All of it is made once.
type contract struct {
	asYAML, asJSON, html text
	assets               http.Handler
	catalogue            []byte
	kinds                map[string][]byte
	policy               []string // content security policy of the page
}

// text is a text with the tag by which caches know it.
type text struct {
	content []byte
	tag     string
}

func newText(content []byte) text {
	sum := sha256.Sum256(content)
	return text{content, `"` + hex.EncodeToString(sum[:8]) + `"`}
}

const docsPath = "/docs"

func newContract(asJSON []byte) (contract, error) {
	c := contract{
		asYAML: newText(api.OpenAPI),
		asJSON: newText(append(asJSON, '\n')),
		assets: v5emb.New("guardrow", "/v1/openapi.json", docsPath),
		kinds:  make(map[string][]byte),
	}
	kinds := api.ProblemTypes()
	var err error
	if c.catalogue, err = encode(api.ProblemCatalogue{Problems: kinds}); err != nil {
		return c, err
	}
	for _, kind := range kinds {
		if c.kinds[strings.TrimPrefix(kind.Type, api.ProblemRoot+"/")], err = encode(kind); err != nil {
			return c, err
		}
	}
	page := &recorder{header: make(http.Header)}
	c.assets.ServeHTTP(page, &http.Request{Method: http.MethodGet, URL: &url.URL{Path: docsPath}})
	if page.status >= http.StatusBadRequest || page.body.Len() == 0 {
		return c, errors.New("the page at /docs cannot be made")
	}
	c.html = newText(page.body.Bytes())
	c.policy = []string{pagePolicy(c.html.content)}
	return c, nil
}

var inlineScript = regexp.MustCompile(`(?s)<script>(.*?)</script>`)

// pagePolicy returns the content security policy of the page: its own scripts and no others, told by their hashes where they
// stand in the page itself. Its widgets set styles as they go, and draw with pictures written into the style sheet.
func pagePolicy(html []byte) string {
	scripts := []string{"'self'"}
	for _, match := range inlineScript.FindAllSubmatch(html, -1) {
		sum := sha256.Sum256(match[1])
		scripts = append(scripts, "'sha256-"+base64.StdEncoding.EncodeToString(sum[:])+"'")
	}
	return "default-src 'none'; script-src " + strings.Join(scripts, " ") +
		"; style-src 'self' 'unsafe-inline'; img-src 'self' data:; font-src 'self'; connect-src 'self'; frame-ancestors 'none'; base-uri 'none'; form-action 'none'"
}

func (c *contract) yaml(x *exchange) error { return c.serve(x, "application/yaml", c.asYAML) }

func (c *contract) json(x *exchange) error { return c.serve(x, jsonType, c.asJSON) }

func (c *contract) page(x *exchange) error {
	x.Response().Header()["Content-Security-Policy"] = c.policy
	return c.serve(x, "text/html; charset=utf-8", c.html)
}

// serve serves a text, or that it has not changed.
func (c *contract) serve(x *exchange, media string, t text) error {
	header := x.Response().Header()
	header.Set("Content-Type", media)
	header.Set("ETag", t.tag)
	header.Set("Cache-Control", "no-cache")
	x.Request().Header.Del("Range") // whole or not at all
	http.ServeContent(x.Response(), x.Request(), "", time.Time{}, bytes.NewReader(t.content))
	return nil
}

// asset serves a file of the page.
func (c *contract) asset(x *exchange) error {
	name := x.Param("asset")
	if !pageFiles[name] {
		return refuse(api.NotFound, "The page has no file of this name.")
	}
	x.Request().Header.Del("Range")
	c.assets.ServeHTTP(x.Response(), x.Request())
	return nil
}

// pageFiles are the files that the page needs.
var pageFiles = map[string]bool{
	"swagger-ui.css":                  true,
	"swagger-ui-bundle.js":            true,
	"swagger-ui-standalone-preset.js": true,
	"favicon-16x16.png":               true,
	"favicon-32x32.png":               true,
}

func (c *contract) problems(x *exchange) error {
	return send(x, http.StatusOK, jsonType, c.catalogue)
}

func (c *contract) problem(x *exchange) error {
	kind, ok := c.kinds[x.Param("kind")]
	if !ok {
		return refuse(api.NotFound, "There is no kind of problem of this name. GET /v1/problems lists all kinds.")
	}
	return send(x, http.StatusOK, jsonType, kind)
}

func (s *Service) health(x *exchange) error {
	return sendJSON(x, http.StatusOK, jsonType, api.Health{Status: api.Alive})
}

func (s *Service) readiness(x *exchange) error {
	x.Response().Header()["Cache-Control"] = noStore
	if s.draining.Load() {
		return shuttingDown()
	}
	return sendJSON(x, http.StatusOK, jsonType, api.Health{Status: api.Ready})
}

// recorder keeps an answer.
type recorder struct {
	header http.Header
	status int
	body   bytes.Buffer
}

func (r *recorder) Header() http.Header            { return r.header }
func (r *recorder) WriteHeader(status int)         { r.status = status }
func (r *recorder) Write(text []byte) (int, error) { return r.body.Write(text) }
