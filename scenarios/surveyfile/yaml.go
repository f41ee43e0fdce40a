package surveyfile

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"regexp"
	"strconv"
	"strings"
	"unicode/utf8"

	"go.yaml.in/yaml/v3"
)

// parse reads the YAML text as one document, whose top it returns.
func (l *loader) parse(text []byte) (top *yaml.Node) {
	text = bytes.TrimPrefix(text, []byte("\ufeff"))
	if line, what := badText(text); line > 0 {
		l.fault(&yaml.Node{Line: line}, what, "want a text file in UTF-8")
		return nil
	}
	var doc yaml.Node
	decoder := yaml.NewDecoder(bytes.NewReader(text))
	err := decodeYAML(decoder, &doc)
	if err == nil {
		var second yaml.Node
		if err2 := decodeYAML(decoder, &second); err2 == nil {
			l.fault(&second, "a second YAML document starts here", "want one survey a file")
			return nil
		} else if !errors.Is(err2, io.EOF) {
			err = err2
		}
	}
	switch {
	case errors.Is(err, io.EOF):
		l.fault(&doc, "the file is empty", "want the keys of a survey: "+strings.Join(keysAt(""), ", "))
		return nil
	case err != nil:
		line, message := yamlFault(text, err)
		l.fault(&yaml.Node{Line: line}, "it is not YAML here: "+clip(message), "want keys and values, indented by spaces, with lists in [] or after -")
		return nil
	}
	top = doc.Content[0]
	if n, loop := written(top, map[*yaml.Node]int{}); loop != nil {
		l.fault(loop, "an alias stands inside what it stands for", "write the values out")
		return nil
	} else if n > maxNodes {
		l.fault(top, "with its aliases written out the file is too large", fmt.Sprintf("want at most %d keys and values", maxNodes))
		return nil
	}
	return top
}

// decodeYAML decodes a document. The library has panicked on odd bytes
// before; a bad file must not end the program.
func decodeYAML(d *yaml.Decoder, into *yaml.Node) (err error) {
	defer func() {
		if p := recover(); p != nil {
			err = fmt.Errorf("yaml: %v", p)
		}
	}()
	return d.Decode(into)
}

// written counts the nodes under n with aliases written out, up to a little
// over maxNodes, or finds an alias inside its own anchor. A size of -1 marks
// the nodes that are being counted.
func written(n *yaml.Node, sizes map[*yaml.Node]int) (size int, loop *yaml.Node) {
	if n.Kind == yaml.AliasNode {
		if s, ok := sizes[n.Alias]; ok && s < 0 {
			return 0, n
		} else if ok {
			return s, nil
		}
		return written(n.Alias, sizes)
	}
	sizes[n] = -1
	size = 1
	for _, c := range n.Content {
		s, loop := written(c, sizes)
		if loop != nil {
			return 0, loop
		}
		size = min(size+s, maxNodes+1)
	}
	sizes[n] = size
	return size, nil
}

// badText finds the first line with bytes that no text file has, which the
// YAML library would refuse without saying where.
func badText(text []byte) (line int, what string) {
	for i := 0; i < len(text); {
		c, n := utf8.DecodeRune(text[i:])
		line := func() int { return 1 + bytes.Count(text[:i], []byte("\n")) }
		switch {
		case c == utf8.RuneError && n == 1:
			return line(), fmt.Sprintf("the byte 0x%02X is not UTF-8", text[i])
		case c < ' ' && c != '\t' && c != '\n' && c != '\r', c >= 0x7f && c < 0xa0 && c != 0x85:
			return line(), fmt.Sprintf("the control character U+%04X is here", c)
		}
		i += n
	}
	return 0, ""
}

// yamlLine finds the line in a message of the YAML library.
var yamlLine = regexp.MustCompile(`^yaml: (?:line (\d+): )?(.*)$`)

// yamlAnchor finds the name in a message that has no line.
var yamlAnchor = regexp.MustCompile(`^unknown anchor '(.*)' referenced$`)

// parserFaults are how the messages begin whose line the library counts
// from 0; those of its scanner are counted from 1.
var parserFaults = []string{
	"did not find expected <", "did not find expected node content", "did not find expected '-' indicator",
	"did not find expected key", "did not find expected ','", "found undefined tag handle",
	"found duplicate %", "found incompatible YAML",
}

// yamlFault says where and what the YAML library stumbled over.
func yamlFault(text []byte, err error) (line int, message string) {
	line, message = 1, err.Error()
	m := yamlLine.FindStringSubmatch(message)
	if m == nil {
		return line, message
	}
	message = m[2]
	if a := yamlAnchor.FindStringSubmatch(message); a != nil {
		if i := bytes.Index(text, []byte("*"+a[1])); i >= 0 {
			line += bytes.Count(text[:i], []byte("\n"))
		}
		return line, fmt.Sprintf("*%s stands for no anchor", a[1])
	}
	if n, err := strconv.Atoi(m[1]); err == nil {
		line = n
		for _, p := range parserFaults {
			if strings.HasPrefix(message, p) {
				return line + 1, message
			}
		}
	}
	return line, message
}
