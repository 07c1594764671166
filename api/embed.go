package api

import _ "embed"

// OpenAPI is the contract as it was written, in YAML. Its bytes are not to be changed.
//
//go:embed openapi.yaml
var OpenAPI []byte
