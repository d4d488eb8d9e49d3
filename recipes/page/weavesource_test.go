package page_test

import _ "embed"

//go:embed weave_test.go
var weaveSource string
