package api

import "strings"

// Rules on a request's form, and on what stands around it: its path, method, media types, size and time.
const (
	// EmptyBody: a request has a body.
	EmptyBody Code = "empty_body"
	// InvalidUTF8: a body is UTF-8.
	InvalidUTF8 Code = "invalid_utf8"
	// NotJSON: a body is JSON as RFC 8259 has it.
	NotJSON Code = "not_json"
	// TrailingText: nothing but white space follows the JSON value.
	TrailingText Code = "trailing_text"
	// TooDeep: arrays and objects are nested at most 128 deep.
	TooDeep Code = "too_deep"
	// NotAnObject: a request is a JSON object.
	NotAnObject Code = "not_an_object"
	// DuplicateKey: a field stands once in its object, a part once in its form.
	DuplicateKey Code = "duplicate_key"
	// InvalidForm: a form is multipart/form-data as RFC 7578 has it, and each part has a name.
	InvalidForm Code = "invalid_form"
	// IncompleteBody: a body is as long as was announced.
	IncompleteBody Code = "incomplete_body"
	// UnknownField: a request has no fields but those of the contract.
	UnknownField Code = "unknown_field"
	// MissingField: a request has the fields that the contract requires.
	MissingField Code = "missing_field"
	// ConflictingFields: of fields that exclude each other, a request has one.
	ConflictingFields Code = "conflicting_fields"
	// WrongType: a value is of the type that the contract has for it.
	WrongType Code = "wrong_type"
	// NotInEnumeration: where the contract lists the words, a value is one of them.
	NotInEnumeration Code = "not_in_enumeration"

	// NotFound: there is something at the path.
	NotFound Code = "not_found"
	// MethodNotAllowed: the path is there for the method.
	MethodNotAllowed Code = "method_not_allowed"
	// NotAcceptable: the header Accept admits JSON.
	NotAcceptable Code = "not_acceptable"
	// BodyTooSlow: a body arrives in the time that the service waits for it.
	BodyTooSlow Code = "body_too_slow"
	// BodyTooLarge: a body is no larger than the service takes.
	BodyTooLarge Code = "body_too_large"
	// EnvelopeTooLarge: what is not readings is no larger than the service takes.
	EnvelopeTooLarge Code = "envelope_too_large"
	// UnsupportedMediaType: a body is of a media type that the operation takes.
	UnsupportedMediaType Code = "unsupported_media_type"
	// UnsupportedEncoding: a body is sent as it is, not compressed.
	UnsupportedEncoding Code = "unsupported_encoding"

	// NumberOutOfRange: a number lies within the range of a double.
	NumberOutOfRange Code = "number_out_of_range"
	// OutOfBounds: a value keeps to the bounds that the contract states.
	OutOfBounds Code = "out_of_bounds"

	// TooManyRequests: a caller sends no more requests than the operator allows one caller.
	TooManyRequests Code = "too_many_requests"

	// InternalError: a defect of the service.
	InternalError Code = "internal_error"
	// Overloaded: the service has room for the request.
	Overloaded Code = "overloaded"
	// ShuttingDown: the service is not about to stop.
	ShuttingDown Code = "shutting_down"
	// TimeLimit: an answer takes no longer than the service's time limit.
	TimeLimit Code = "time_limit"
)

func requestRules() []Entry {
	const rack = `{"name": "rack", "levels": 2, "effect": "fixed"}`
	const plain = `{"design": {"factors": [` + rack + `]}}`
	post := func(body string) Example { return Example{Path: "/v1/terms", Body: body} }
	design := func(rest string) Example { return post(`{"design": {"factors": [` + rack + `]` + rest + `}}`) }
	under := func(s Setting, e Example) Example {
		e.Setting = s
		return e
	}
	return []Entry{
		{Code: EmptyBody, Status: 400, Rule: "A request has a body.", Example: post("")},
		{Code: InvalidUTF8, Status: 400, Rule: "A body is UTF-8.", Example: post("{\"id\": \"r\xe9plique\", \"design\": {\"factors\": [" + rack + "]}}")},
		{Code: NotJSON, Status: 400, Rule: "A body is JSON as RFC 8259 has it: names and texts in double quotation marks, no comments, no comma after the last value, no NaN.", Example: post(`{"design": {"factors": [{"name": 'rack', "levels": 2, "effect": "fixed"}]}}`)},
		{Code: TrailingText, Status: 400, Rule: "Nothing but white space follows the JSON value.", Example: post(plain + ` {"id": 2}`)},
		{Code: TooDeep, Status: 400, Rule: "Arrays and objects are nested at most 128 deep.", Example: post(`{"design": ` + strings.Repeat("[", 200) + strings.Repeat("]", 200) + `}`)},
		{Code: NotAnObject, Status: 400, Rule: "A request is a JSON object.", Example: post(`[` + plain + `]`)},
		{Code: DuplicateKey, Status: 400, Rule: "A field stands once in its object, and a part once in its form.", Example: design(`, "replicates": 2, "replicates": 3`)},
		{Code: InvalidForm, Status: 400, Rule: "A form is multipart/form-data as RFC 7578 has it, and each of its parts has a name.", Example: Example{Path: "/v1/anova", MediaType: "multipart/form-data; boundary=cut", Body: "--cut\r\nContent-Disposition: form-data\r\n\r\nrack\r\n--cut--\r\n"}},
		{Code: IncompleteBody, Status: 400, Rule: "A body is as long as was announced.", Example: under(CutShort, post(plain))},
		{Code: UnknownField, Status: 400, Rule: "A request has no fields but those of the contract.", Example: design(`, "replicate": 2`)},
		{Code: MissingField, Status: 400, Rule: "A request has the fields that the contract requires.", Example: post(`{"design": {"factors": [{"name": "rack", "levels": 2}]}}`)},
		{Code: ConflictingFields, Status: 400, Rule: "Of fields that exclude each other, such as data and csv, a request has one.", Example: Example{Path: "/v1/anova", Body: `{"design": {"factors": [` + rack + `]}, "data": {"rack": [1, 2], "height": [3, 4]}, "csv": "rack,height\n1,3\n2,4\n"}`}},
		{Code: WrongType, Status: 400, Rule: "A value is of the type that the contract has for it.", Example: post(`{"design": {"factors": [{"name": "rack", "levels": "2", "effect": "fixed"}]}}`)},
		{Code: NotInEnumeration, Status: 400, Rule: "Where the contract lists the words, a value is one of them.", Example: post(`{"design": {"factors": [{"name": "rack", "levels": 2, "effect": "fxed"}]}}`)},

		{Code: NotFound, Status: 404, Rule: "There is something at the path.", Example: Example{Path: "/v1/term", Body: plain}},
		{Code: MethodNotAllowed, Status: 405, Rule: "The path is there for the method.", Example: Example{Method: "GET", Path: "/v1/terms"}},
		{Code: NotAcceptable, Status: 406, Rule: "The header Accept, where there is one, admits application/json.", Example: Example{Path: "/v1/terms", Accept: "text/csv", Body: plain}},
		{Code: BodyTooSlow, Status: 408, Rule: "A body arrives in the time that the service waits for it.", Example: under(StalledBody, post(plain))},
		{Code: BodyTooLarge, Status: 413, Rule: "A body is no larger than the service takes.", Example: under(BodyLimit, post(`{"id": "`+strings.Repeat("x", BodyLimitOfExample)+`"}`))},
		{Code: EnvelopeTooLarge, Status: 413, Rule: "What is not readings is no larger than the service takes.", Example: under(EnvelopeLimit, post(`{"id": "`+strings.Repeat("x", EnvelopeLimitOfExample)+`"}`))},
		{Code: UnsupportedMediaType, Status: 415, Rule: "A body is of a media type that the operation takes: application/json, or, for /v1/anova, multipart/form-data too; in UTF-8.", Example: Example{Path: "/v1/terms", MediaType: "text/csv", Body: "rack,height\n1,3\n"}},
		{Code: UnsupportedEncoding, Status: 415, Rule: "A body is sent as it is, not compressed.", Example: Example{Path: "/v1/terms", Encoding: "gzip", Body: plain}},

		{Code: NumberOutOfRange, Status: 422, Rule: "A number lies within the range of a double, below 1.8e308 in size.", Example: post(`{"design": {"factors": [{"name": "rack", "levels": [1, 1e999999999], "effect": "fixed"}]}}`)},
		{Code: OutOfBounds, Status: 422, Rule: "A value keeps to the bounds that the contract states for it: lengths of texts and lists, and sizes of numbers.", Example: post(`{"id": "` + strings.Repeat("7", 201) + `", "design": {"factors": [` + rack + `]}}`)},

		{Code: TooManyRequests, Status: 429, Rule: "A caller sends no more requests than the operator allows one caller.", Example: under(RateLimit, post(plain))},

		{Code: InternalError, Status: 500, Rule: "The service has no defect that this request meets.", Example: under(Defect, post(plain))},
		{Code: Overloaded, Status: 503, Rule: "The service has room for the request.", Example: under(Busy, post(plain))},
		{Code: ShuttingDown, Status: 503, Rule: "The service is not about to stop.", Example: under(Draining, Example{Method: "GET", Path: "/readyz"})},
		{Code: TimeLimit, Status: 503, Rule: "An answer takes no longer than the service's time limit.", Example: under(NoTime, post(plain))},
	}
}
