package api

// ProblemRoot is the path under which each kind of problem has its page.
const ProblemRoot = "/v1/problems"

// ProblemCatalogue answers GET /v1/problems.
type ProblemCatalogue struct {
	Problems []ProblemType `json:"problems"`
}

// ProblemType is a kind of problem: what a Problem's type refers to. There is one for each status.
type ProblemType struct {
	Type    string        `json:"type"`
	Title   string        `json:"title"`
	Status  int           `json:"status"`
	Meaning string        `json:"meaning"`
	Codes   []ProblemRule `json:"codes"`
}

// ProblemRule is a rule and the code of breaking it.
type ProblemRule struct {
	Code Code   `json:"code"`
	Rule string `json:"rule"`
}

// Health answers GET /healthz and GET /readyz.
type Health struct {
	Status string `json:"status"`
}

// Words for Health.Status.
const (
	Alive = "ok"
	Ready = "ready"
)

// ProblemTypes returns every kind of problem, by status, with the codes of the catalogue that are answered with it.
func ProblemTypes() []ProblemType {
	kinds := []ProblemType{
		{Status: 400, Type: "malformed", Title: "The request is not of the contract's shape", Meaning: "The body is not JSON, or it has fields, types or words that the contract does not have. Nothing was computed; mend everything that is listed and send it again."},
		{Status: 404, Type: "not-found", Title: "There is nothing at this path", Meaning: "The path is misspelt, or of another version. The contract at /v1/openapi.yaml lists every path."},
		{Status: 405, Type: "method-not-allowed", Title: "The path is not there for this method", Meaning: "The header Allow of the answer lists the methods that the path is there for."},
		{Status: 406, Type: "not-acceptable", Title: "No acceptable media type", Meaning: "The header Accept leaves no media type in which the operation answers. Send application/json in it, or leave it out."},
		{Status: 408, Type: "too-slow", Title: "The body did not arrive in time", Meaning: "The service waits for a body for a limited time only. Send it again, over a faster connection if it is large."},
		{Status: 413, Type: "too-large", Title: "The request is too large", Meaning: "The body, or what of it is not readings, is larger than the operator lets the service take. Send fewer responses at a time, or shorter lists of labels."},
		{Status: 415, Type: "unsupported-media-type", Title: "The body is of a media type that is not taken", Meaning: "Send JSON as application/json; readings as a CSV file go to /v1/anova as multipart/form-data. Send bodies uncompressed."},
		{Status: 422, Type: "rule-broken", Title: "The request breaks rules", Meaning: "The request is of the right shape, but what it declares or sends breaks rules, all of which are listed. Nothing was guessed; mend them and send it again."},
		{Status: 429, Type: "too-many-requests", Title: "Too many requests", Meaning: "The operator allows one caller a limited number of requests. Wait as many seconds as the header Retry-After says."},
		{Status: 500, Type: "internal", Title: "The service has a defect", Meaning: "It is not the request's fault. Report it with the request's name, which is in the header X-Request-Id and in the log."},
		{Status: 503, Type: "unavailable", Title: "The service cannot answer now", Meaning: "It has too much to do, is shutting down, or gave the request up at its time limit. Wait as many seconds as the header Retry-After says; a request that met the time limit should be made smaller."},
	}
	for i := range kinds {
		kinds[i].Type = ProblemRoot + "/" + kinds[i].Type
		kinds[i].Codes = []ProblemRule{}
		for _, entry := range Catalogue() {
			if entry.Status == kinds[i].Status {
				kinds[i].Codes = append(kinds[i].Codes, ProblemRule{entry.Code, entry.Rule})
			}
		}
	}
	return kinds
}
