package page

import (
	"errors"
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"path"
	"strings"
	"unicode"
	"unicode/utf8"
)

// script is a recipe as it is written: the body of its function, cut into steps.
type script struct {
	name  string // of the file
	lead  string // the doc comment
	lines []string
	whole map[int]bool // lines, from 1, that begin inside a raw string: their indentation is data
	steps []step
	end   int // line of the closing brace
}

// step is a comment or a statement of the body.
type step struct {
	first, last int    // lines
	prose       string // Markdown, of a comment
	code        bool
	noise       bool // hands an error or nil back: the reader can do without
	weave       bool // the call of Weave
}

// errOutOfStep is what a wrong source means and what cures it.
var errOutOfStep = errors.New("the text given to Weave is not the file that the program was built from; embed the recipe's own file by //go:embed and build again")

// read parses the recipe's file and finds the function that called Weave.
func (r recipe) read() (*script, error) {
	fset := token.NewFileSet()
	file, err := parser.ParseFile(fset, path.Base(r.file), r.source, parser.ParseComments|parser.SkipObjectResolution)
	if err != nil {
		return nil, fmt.Errorf("%w: %w", err, errOutOfStep)
	}
	line := func(p token.Pos) int { return fset.Position(p).Line }
	s := &script{name: path.Base(r.file), lines: strings.Split(r.source, "\n"), whole: map[int]bool{}}
	var block *ast.BlockStmt
	for _, d := range file.Decls {
		ast.Inspect(d, func(n ast.Node) bool {
			var found *ast.BlockStmt
			switch n := n.(type) {
			case *ast.FuncDecl:
				found = n.Body
			case *ast.FuncLit:
				found = n.Body
			case *ast.BasicLit:
				if n.Kind == token.STRING && strings.HasPrefix(n.Value, "`") {
					for l := line(n.Pos()) + 1; l <= line(n.End()); l++ {
						s.whole[l] = true
					}
				}
			}
			if found != nil && weaves(found, r.line, line) && named(d, r.function) {
				block, s.lead = found, lead(d, n)
			}
			return true
		})
	}
	if block == nil {
		return nil, fmt.Errorf("%s called Weave in line %d, where the text has no such statement in that function's own body: %w",
			shortName(r.function), r.line, errOutOfStep)
	}
	s.end = line(block.Rbrace)
	s.cut(block, file.Comments, r.line, line)
	return s, nil
}

// weaves says whether a statement of the block itself is a call of Weave that holds the line.
func weaves(b *ast.BlockStmt, at int, line func(token.Pos) int) bool {
	for _, st := range b.List {
		x, ok := st.(*ast.ExprStmt)
		if !ok || at < line(st.Pos()) || at > line(st.End()) {
			continue
		}
		if call, ok := x.X.(*ast.CallExpr); ok {
			if sel, ok := call.Fun.(*ast.SelectorExpr); ok && sel.Sel.Name == "Weave" {
				return true
			}
		}
	}
	return false
}

// named says whether the run-time name of a function can be that of a function in declaration d: with a function's
// or method's name in it. What a variable is given has no name to compare.
func named(d ast.Decl, function string) bool {
	f, ok := d.(*ast.FuncDecl)
	return !ok || strings.Contains(strings.ReplaceAll(shortName(function), "[...]", "")+".", "."+f.Name.Name+".")
}

// shortName is a run-time name without the path of its package.
func shortName(function string) string { return function[strings.LastIndexByte(function, '/')+1:] }

// lead is the comment above the recipe: of its function, or of the variable that holds it. How Go's comments begin, "Name is
// the page of ...", is for readers of the code: the page begins with what it is of.
func lead(d ast.Decl, n ast.Node) string {
	switch d := d.(type) {
	case *ast.FuncDecl:
		if n == ast.Node(d) {
			text := markdownOf(d.Doc)
			if of, is := strings.CutPrefix(text, d.Name.Name+" is the page of "); is {
				first, size := utf8.DecodeRuneInString(of)
				return string(unicode.ToUpper(first)) + of[size:]
			}
			return text
		}
	case *ast.GenDecl:
		if len(d.Specs) == 1 {
			return markdownOf(d.Doc)
		}
	}
	return ""
}

// cut cuts the body into steps. What shares a line is one step.
func (s *script) cut(b *ast.BlockStmt, comments []*ast.CommentGroup, weave int, line func(token.Pos) int) {
	add := func(st step) {
		if n := len(s.steps); n > 0 && s.steps[n-1].last >= st.first {
			before := &s.steps[n-1]
			if !before.code { // a comment in front of a statement in its line is code
				before.prose, before.code, before.noise = "", st.code, st.noise
			}
			before.last = max(before.last, st.last)
			before.weave = before.weave || st.weave
			before.noise = before.noise && (st.noise || !st.code)
			return
		}
		s.steps = append(s.steps, st)
	}
	comment := func(c *ast.CommentGroup) {
		if text := markdownOf(c); text != "" {
			add(step{first: line(c.Pos()), last: line(c.End() - 1), prose: text})
		}
	}
	for _, st := range b.List {
		for len(comments) > 0 && comments[0].Pos() < st.Pos() {
			if comments[0].Pos() > b.Lbrace {
				comment(comments[0])
			}
			comments = comments[1:]
		}
		for len(comments) > 0 && comments[0].Pos() < st.End() { // inside the statement
			comments = comments[1:]
		}
		first, last := line(st.Pos()), line(st.End()-1)
		add(step{first: first, last: last, code: true, noise: noise(st), weave: first <= weave && weave <= last})
	}
	for _, c := range comments {
		if c.Pos() > b.Lbrace && c.Pos() < b.Rbrace {
			comment(c)
		}
	}
}

// noise says whether a statement does nothing but return: an error when there is one, or in the end.
func noise(st ast.Stmt) bool {
	switch st := st.(type) {
	case *ast.ReturnStmt:
		for _, x := range st.Results {
			if _, ok := x.(*ast.Ident); !ok {
				return false
			}
		}
		return true
	case *ast.IfStmt:
		c, ok := st.Cond.(*ast.BinaryExpr)
		if !ok || st.Init != nil || st.Else != nil || c.Op != token.NEQ || len(st.Body.List) != 1 {
			return false
		}
		none, ok := c.Y.(*ast.Ident)
		_, returns := st.Body.List[0].(*ast.ReturnStmt)
		return ok && none.Name == "nil" && returns
	}
	return false
}

// at is the step of a line of the body. What runs when the function is left belongs to its last statement.
func (s *script) at(line int) (int, error) {
	last := -1
	for i, st := range s.steps {
		if !st.code {
			continue
		}
		if st.first <= line && line <= st.last {
			return i, nil
		}
		last = i
	}
	if line == s.end && last >= 0 {
		return last, nil
	}
	return 0, fmt.Errorf("line %d made a result and is no statement of the recipe: %w", line, errOutOfStep)
}
