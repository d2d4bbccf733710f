package site

import _ "embed"

var (
	//go:embed example.site.toml
	exampleSite string
	//go:embed example.map.toml
	exampleMap string
	//go:embed template.site.toml
	templateSite string
	//go:embed template.map.toml
	templateMap string
)

// The file names of the built-in example.
const (
	ExampleName    = "example.site.toml"
	ExampleMapName = "example.map.toml"
)

// Example gives the texts of the built-in site file and its register map, lines ended by LF. The site is invented; on paper
// everything passes but the warning label of the discharge, which is marginal.
func Example() (site, registers string) { return exampleSite, exampleMap }

// Template gives the text of a commented site file to start from, which passes as it stands; mapFile is the name of the
// register map that it refers to, without control characters.
func Template(mapFile string) (string, error) {
	revised, err := Revise([]byte(templateSite), map[string]string{"device.map": mapFile})
	return string(revised), err
}

// MapTemplate gives the text of a commented register map to start from.
func MapTemplate() string { return templateMap }
