package report

import (
	"html/template"
	"strings"
)

// pageTemplate is one page without anything from elsewhere: it opens in a
// browser without a network and prints on paper.
const pageTemplate = `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<title>rowstead: {{.Title}}</title>
<style>
body { font-family: sans-serif; max-width: 60rem; margin: 2rem auto; padding: 0 1rem; color: #222222; background: #ffffff; }
pre { white-space: pre-wrap; }
svg { width: 100%; height: auto; border: 1px solid #dddddd; }
td, th { text-align: left; padding: 0.15rem 1rem 0.15rem 0; vertical-align: top; }
.hash { font-family: monospace; font-size: 0.8rem; word-break: break-all; }
</style>
</head>
<body>
<h1>{{.Title}}</h1>
<pre>{{.Text}}</pre>
<h2>Convergence</h2>
{{.Picture}}
<h2>Inputs</h2>
<table>
<tr><th>what</th><th>file</th><th>bytes</th><th>SHA-256</th></tr>
{{range .Inputs}}<tr><td>{{.Role}}</td><td>{{.Path}}</td><td>{{.Size}}</td><td class="hash">{{.Hash}}</td></tr>
{{end}}</table>
<h2>What happened</h2>
<table>
<tr><th>products</th><th>cycle</th><th>step</th><th></th></tr>
{{range .Story}}<tr><td>{{.Products}}</td><td>{{.Cycle}}</td><td>{{.Step}}</td><td>{{.Text}}</td></tr>
{{end}}</table>
</body>
</html>
`

// HTML returns the report as one standalone page with its picture inside.
func (r *Record) HTML() string {
	page := template.Must(template.New("page").Parse(pageTemplate))
	var b strings.Builder
	err := page.Execute(&b, struct {
		Title, Text string
		Picture     template.HTML
		Inputs      []Input
		Story       []Event
	}{r.title(), r.Text(), template.HTML(r.Picture()), r.Inputs, r.Story})
	if err != nil {
		panic("report: the page's template does not fit the record")
	}
	return b.String()
}

// title names the run by its matrix and verdict.
func (r *Record) title() string {
	name := "a run"
	for _, in := range r.Inputs {
		if in.Role == "matrix" {
			name = in.Path[strings.LastIndexAny(in.Path, `/\`)+1:]
		}
	}
	return name + ": " + r.Verdict
}
