package service

import (
	"mime"
	"net/http"
	"strconv"
	"strings"

	"guardrow/api"
)

const (
	jsonType    = "application/json"
	problemType = "application/problem+json"
	formType    = "multipart/form-data"
)

// mediaType returns the media type of a request's body, and for a form its boundary, or refuses it.
func mediaType(header http.Header, form bool) (media, boundary string, err error) {
	for _, encoding := range header.Values("Content-Encoding") {
		if encoding != "" && !strings.EqualFold(encoding, "identity") {
			return "", "", refuse(api.UnsupportedEncoding, "The body is compressed, which this service does not take. Send it as it is, without a Content-Encoding.")
		}
	}
	given := header.Get("Content-Type")
	if given == jsonType {
		return jsonType, "", nil
	}
	media, parameters, err := mime.ParseMediaType(given)
	charset := parameters["charset"]
	switch {
	case err == nil && media == jsonType && (charset == "" || strings.EqualFold(charset, "utf-8")):
		return jsonType, "", nil
	case err == nil && media == formType && form:
		return formType, parameters["boundary"], nil
	}
	wanted := jsonType
	if form {
		wanted += " or " + formType
	}
	reason := "The body's media type is not given"
	switch {
	case media == jsonType && charset != "":
		reason = "The body is in another encoding than UTF-8"
	case given != "":
		reason = "The body's media type is not one that this operation takes"
	}
	return "", "", refuse(api.UnsupportedMediaType, reason+". Send "+wanted+" in the header Content-Type.")
}

// acceptsJSON reports whether the header Accept admits JSON (RFC 9110, section 12.5.1): the most specific range that covers
// it has a weight above 0.
func acceptsJSON(header http.Header) bool {
	values := header["Accept"]
	if len(values) == 0 {
		return true
	}
	best, weight := 0, 0.0
	for _, value := range values {
		for _, part := range strings.Split(value, ",") {
			media, q := mediaRange(part)
			precision := 0
			switch media {
			case jsonType:
				precision = 3
			case "application/*":
				precision = 2
			case "*/*":
				precision = 1
			}
			if precision > best || precision == best && q > weight {
				best, weight = precision, q
			}
		}
	}
	return best > 0 && weight > 0 || strings.TrimSpace(strings.Join(values, "")) == ""
}

// mediaRange returns a range of Accept and its weight. Other parameters do not matter for JSON, which has none.
func mediaRange(text string) (media string, weight float64) {
	media, parameters, _ := strings.Cut(text, ";")
	weight = 1
	for _, p := range strings.Split(parameters, ";") {
		name, value, _ := strings.Cut(p, "=")
		if strings.EqualFold(strings.TrimSpace(name), "q") {
			if q, err := strconv.ParseFloat(strings.TrimSpace(value), 64); err == nil {
				weight = q
			}
		}
	}
	return strings.ToLower(strings.TrimSpace(media)), weight
}
