package emit_test

import (
	"fmt"
	"strconv"
	"strings"
)

// statements reads up to one of the closing words, which stays.
func (p *stParser) statements(closing ...string) []*stNode {
	var list []*stNode
	for {
		for _, c := range closing {
			if p.peek() == c {
				return list
			}
		}
		list = append(list, p.statement())
	}
}

func (p *stParser) statement() *stNode {
	switch p.peek() {
	case "IF":
		return p.ifStatement()
	case "FOR":
		return p.forStatement()
	}
	target := p.variable()
	if target.op == "name" && p.blocks[p.kindOf(target.name)] != nil {
		return p.call(target)
	}
	if v := p.unit.variables[p.unit.index[target.name]]; v.section == "CONSTANT" || v.section == "VAR_INPUT" {
		panic("assignment to " + v.name)
	}
	p.need(":=")
	n := &stNode{op: ":=", parts: []*stNode{target, p.expression(0)}}
	p.need(";")
	return n
}

func (p *stParser) ifStatement() *stNode {
	p.take()
	n := &stNode{op: "IF", parts: []*stNode{p.expression(0)}}
	p.need("THEN")
	n.parts = append(n.parts, &stNode{op: "list", parts: p.statements("ELSE", "ELSIF", "END_IF")})
	if p.peek() == "ELSIF" {
		n.parts = append(n.parts, &stNode{op: "list", parts: []*stNode{p.ifStatement()}})
		return n
	}
	if p.accept("ELSE") {
		n.parts = append(n.parts, &stNode{op: "list", parts: p.statements("END_IF")})
	}
	p.need("END_IF")
	p.need(";")
	return n
}

func (p *stParser) forStatement() *stNode {
	p.take()
	target := p.variable()
	p.need(":=")
	n := &stNode{op: "FOR", parts: []*stNode{target, p.expression(0)}}
	p.need("TO")
	n.parts = append(n.parts, p.expression(0))
	p.need("DO")
	n.parts = append(n.parts, &stNode{op: "list", parts: p.statements("END_FOR")})
	p.need("END_FOR")
	p.need(";")
	return n
}

// call reads the arguments of a function block.
func (p *stParser) call(target *stNode) *stNode {
	n := &stNode{op: "call", name: target.name}
	block := p.blocks[p.kindOf(target.name)]
	p.need("(")
	for {
		name := p.take().text
		at, ok := block.index[name]
		if !ok || block.variables[at].section != "VAR_INPUT" {
			panic("no input " + name)
		}
		p.need(":=")
		n.parts = append(n.parts, &stNode{op: name, parts: []*stNode{p.expression(0)}})
		if !p.accept(",") {
			break
		}
	}
	p.need(")")
	p.need(";")
	return n
}

func (p *stParser) kindOf(name string) string {
	at, ok := p.unit.index[name]
	if !ok {
		panic("not declared: " + name)
	}
	return p.unit.variables[at].kind
}

// variable reads name, name[index] or block.output.
func (p *stParser) variable() *stNode {
	name := p.take().text
	kind := p.kindOf(name)
	if block := p.blocks[kind]; block != nil && p.accept(".") {
		output := p.take().text
		if at, ok := block.index[output]; !ok || block.variables[at].section != "VAR_OUTPUT" {
			panic("no output " + output)
		}
		return &stNode{op: "output", name: name, parts: []*stNode{{name: output}}}
	}
	isArray := p.unit.variables[p.unit.index[name]].length > 0
	if isArray != (p.peek() == "[") {
		panic("index of " + name)
	}
	if !isArray {
		return &stNode{op: "name", name: name}
	}
	p.take()
	n := &stNode{op: "index", name: name, parts: []*stNode{p.expression(0)}}
	p.need("]")
	return n
}

// stLevels are the binary operators, the weakest first.
var stLevels = [][]string{{"OR"}, {"AND"}, {"=", "<>"}, {"<", ">", "<=", ">="}, {"+", "-"}, {"*", "/"}}

func (p *stParser) expression(level int) *stNode {
	if level == len(stLevels) {
		return p.unary()
	}
	n := p.expression(level + 1)
	for p.tokens[0].kind != "number" && strings.Contains(" "+strings.Join(stLevels[level], " ")+" ", " "+p.peek()+" ") {
		op := p.take().text
		n = &stNode{op: op, parts: []*stNode{n, p.expression(level + 1)}}
	}
	return n
}

func (p *stParser) unary() *stNode {
	switch t := p.tokens[0]; {
	case t.text == "-" || t.text == "NOT":
		p.take()
		return &stNode{op: "un" + t.text, parts: []*stNode{p.unary()}}
	case t.text == "(":
		p.take()
		n := p.expression(0)
		p.need(")")
		return n
	case t.kind == "number":
		p.take()
		x, err := strconv.ParseFloat(t.text, 64)
		if err != nil {
			panic(err)
		}
		return &stNode{op: "number", value: x}
	case t.text == "TRUE" || t.text == "FALSE":
		p.take()
		return &stNode{op: "number", value: map[string]float64{"TRUE": 1}[t.text]}
	case t.text == "ABS" || strings.Contains(t.text, "_TO_"):
		if !stWords[t.text] {
			panic(fmt.Sprintf("function %s", t.text))
		}
		p.take()
		p.need("(")
		n := &stNode{op: t.text, parts: []*stNode{p.expression(0)}}
		p.need(")")
		return n
	}
	return p.variable()
}
