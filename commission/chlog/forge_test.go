package chlog_test

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"regexp"
	"strings"
)

// rechain does what a forger does who knows the format but has no key: it makes every prev fit again.
func rechain(log []byte) []byte {
	prev := strings.Repeat("0", 64)
	var out []byte
	for _, line := range bytes.SplitAfter(log, []byte("\n")) {
		if len(line) == 0 {
			continue
		}
		line = append([]byte(`{"prev":"`+prev), line[len(`{"prev":"`)+64:]...)
		sum := sha256.Sum256(line)
		prev = hex.EncodeToString(sum[:])
		out = append(out, line...)
	}
	return out
}

var headLine = regexp.MustCompile(`\\nhead: [0-9a-f]{64}\\n`)

// rechainWithStatements also makes the head in every statement fit.
func rechainWithStatements(log []byte) []byte {
	prev := strings.Repeat("0", 64)
	var out []byte
	for _, line := range bytes.SplitAfter(log, []byte("\n")) {
		if len(line) == 0 {
			continue
		}
		line = append([]byte(`{"prev":"`+prev), line[len(`{"prev":"`)+64:]...)
		line = headLine.ReplaceAll(line, []byte(`\nhead: `+prev+`\n`))
		if !json.Valid(line) {
			panic("the forger broke the line")
		}
		sum := sha256.Sum256(line)
		prev = hex.EncodeToString(sum[:])
		out = append(out, line...)
	}
	return out
}
