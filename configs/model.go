package configs

import (
	"io/fs"
	"os"
	"strings"

	"go.yaml.in/yaml/v3"
)

// ReadModel reads a file that holds only the sections model and align, as they
// would stand in a case. Env and Sets count as far as they concern these. Its
// error is of type Faults and holds everything that is wrong.
func (r Reader) ReadModel(path string) (*Model, Align, error) {
	data, err := load(func(p string) (fs.File, error) { return os.Open(p) }, path)
	if err != nil {
		return nil, Align{}, Faults{{File: path, Origin: OriginFile, Says: err.Error()}}
	}
	return r.ParseModel(path, data)
}

// ParseModel is ReadModel for data already in memory; path is its name in
// faults, and its directory is the one that file names start from.
func (r Reader) ParseModel(path string, data []byte) (*Model, Align, error) {
	root, err := parse(data)
	if err != nil {
		return nil, Align{}, unparsed(path, err)
	}
	if root.Kind == yaml.MappingNode {
		if faults := onlyModel(path, root); len(faults) > 0 {
			return nil, Align{}, faults
		}
		// The rest is the reading of a case around a stand-in orbit.
		root.Content = append(root.Content, textNode("orbit"), &yaml.Node{Kind: yaml.MappingNode, Content: []*yaml.Node{
			textNode("kind"), textNode(Circular), textNode("radius"), {Kind: yaml.ScalarNode, Tag: "!!int", Value: "10"}}})
	}
	only := Reader{features: r.features}
	for _, pair := range r.Env {
		if strings.HasPrefix(pair, variable("model")) || strings.HasPrefix(pair, variable("align")) {
			only.Env = append(only.Env, pair)
		}
	}
	for _, pair := range r.Sets {
		path := strings.TrimSpace(pair)
		if strings.HasPrefix(path, "model.") || strings.HasPrefix(path, "align") {
			only.Sets = append(only.Sets, pair)
			continue
		}
		return nil, Align{}, Faults{{File: "--set", Key: path, Origin: OriginSet, Says: show(path) + " sets nothing of a model; write model.key=value or align=value"}}
	}
	c, err := only.resolve(path, root)
	if err != nil {
		return nil, Align{}, err
	}
	return c.Model, c.Align, nil
}

// onlyModel lists the keys that have no place in a model file.
func onlyModel(path string, root *yaml.Node) Faults {
	var faults Faults
	model := false
	for i := 0; i+1 < len(root.Content); i += 2 {
		switch key := root.Content[i].Value; key {
		case "model":
			model = true
		case "align":
		default:
			faults = append(faults, Fault{File: path, Line: root.Content[i].Line, Key: key, Origin: OriginFile,
				Says: show(key) + " does not belong in a model file, which holds model and align"})
		}
	}
	if !model && len(faults) == 0 {
		faults = append(faults, Fault{File: path, Key: "model", Origin: OriginFile, Says: "model is missing; a model file holds model and align"})
	}
	return faults
}
