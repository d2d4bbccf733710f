package signing_test

import (
	"errors"
	"strings"
	"testing"
	"time"

	"chargehand/commission/signing"
)

func key(t testing.TB, name string) signing.PublicKey {
	t.Helper()
	k, err := signing.ParsePublicKey(read(t, name+".pub"))
	if err != nil {
		t.Fatal(err)
	}
	return k
}

func TestParseAllowedReadsWhatOpenSSHReads(t *testing.T) {
	ed := key(t, "ed25519").AuthorizedKey()
	east := time.FixedZone("", 2*3600)
	for _, c := range []struct {
		name, line string
		want       signing.AllowedEntry
	}{
		{"bare", "tech@example.org " + ed, signing.AllowedEntry{Principals: "tech@example.org"}},
		{"comment", "tech@example.org " + ed + " aft string", signing.AllowedEntry{Principals: "tech@example.org", Comment: "aft string"}},
		{"quoted principals", `"tech@example.org,*@example.net" ` + ed, signing.AllowedEntry{Principals: "tech@example.org,*@example.net"}},
		{"tab between", "tech@example.org\t" + ed, signing.AllowedEntry{Principals: "tech@example.org"}},
		{"options in any case", `t NameSpaces="file,chargehand",VALID-after="20260101Z" ` + ed, signing.AllowedEntry{Principals: "t",
			Namespaces: "file,chargehand", ValidAfter: time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC)}},
		{"local time", `t valid-before="202606151230" ` + ed, signing.AllowedEntry{Principals: "t", ValidBefore: time.Date(2026, 6, 15, 12, 30, 0, 0, east)}},
		{"seconds", `t valid-before="20260615123059Z" ` + ed, signing.AllowedEntry{Principals: "t", ValidBefore: time.Date(2026, 6, 15, 12, 30, 59, 0, time.UTC)}},
	} {
		list, err := signing.ParseAllowed("list", strings.NewReader("# who may sign\n\n  "+c.line+"\r\n"), east)
		if err != nil || len(list.Entries()) != 1 {
			t.Errorf("%s: ParseAllowed = %v, want one entry", c.name, err)
			continue
		}
		e := list.Entries()[0]
		if e.Line != 3 || e.Principals != c.want.Principals || e.Namespaces != c.want.Namespaces || e.Comment != c.want.Comment ||
			!e.ValidAfter.Equal(c.want.ValidAfter) || !e.ValidBefore.Equal(c.want.ValidBefore) || !e.Key.Equal(key(t, "ed25519")) {
			t.Errorf("%s: ParseAllowed = %+v, want %+v in line 3", c.name, e, c.want)
		}
	}
}

func TestParseAllowedRefusesWithTheLine(t *testing.T) {
	ed := key(t, "ed25519").AuthorizedKey()
	for _, c := range []struct{ name, line, want string }{
		{"authority", "*@example.org cert-authority " + ed, "cert-authority: certificates are not read here"},
		{"authority in capitals", `*@example.org CERT-AUTHORITY,namespaces="a" ` + ed, "cert-authority: certificates are not read here"},
		{"no key", "tech@example.org", "neither an option nor a key"},
		{"key alone", ed, "neither an option nor a key"},
		{"unknown option", "t from=\"10.0.0.1\" " + ed, "neither an option nor a key"},
		{"option without quotes", "t namespaces=file " + ed, "quotation marks"},
		{"option without value", "t namespaces " + ed, "quotation marks"},
		{"empty namespaces", `t namespaces="" ` + ed, "namespaces is empty"},
		{"twice", `t namespaces="a",namespaces="b" ` + ed, "stands twice"},
		{"time with dashes", `t valid-after="2024-06-15" ` + ed, "is no time"},
		{"thirteenth month", `t valid-after="20241301" ` + ed, "is no time"},
		{"never valid", `t valid-after="20250101Z",valid-before="20240101Z" ` + ed, "not before valid-before"},
		{"open quote", `t namespaces="a ` + ed, "without its partner"},
		{"open principals", `"t ` + ed, "without its partner"},
		{"broken base64", "t ssh-ed25519 AAAA", "no public key"},
		{"key of another type", "t ssh-rsa " + strings.Fields(ed)[1], "no public key"},
	} {
		_, err := signing.ParseAllowed("list", strings.NewReader("\n"+c.line), time.UTC)
		e, ok := errors.AsType[*signing.ListError](err)
		if !ok || e.Line != 2 || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: ParseAllowed = %v, want a ListError in line 2 with %q", c.name, err, c.want)
		}
	}
}

// The outcomes are those of `ssh-keygen -Y verify -Overify-time=…`, OpenSSH 9.2p1.
func TestFindChecksNamespaceAndTime(t *testing.T) {
	ed := key(t, "ed25519").AuthorizedKey()
	within := time.Date(2024, 6, 15, 0, 0, 0, 0, time.UTC)
	for _, c := range []struct {
		name, list string
		at         time.Time
		want       string // "" allowed, "unknown", else part of the reason
	}{
		{"plain", "t " + ed, within, ""},
		{"namespace matches", `t namespaces="git,charge*" ` + ed, within, ""},
		{"other namespace", `t namespaces="git" ` + ed, within, "not permitted for the namespace"},
		{"negated namespace", `t namespaces="*,!chargehand" ` + ed, within, "not permitted for the namespace"},
		{"inside", `t valid-after="20240101Z",valid-before="20241231Z" ` + ed, within, ""},
		{"before", `t valid-after="20240101Z",valid-before="20241231Z" ` + ed, within.AddDate(-1, 0, 0), "valid only after 2024-01-01"},
		{"after", `t valid-after="20240101Z",valid-before="20241231Z" ` + ed, within.AddDate(1, 0, 0), "expired on 2024-12-31"},
		{"second line allows", `t valid-before="20200101Z" ` + ed + "\nt " + ed, within, ""},
		{"another's key", "t " + key(t, "rsa").AuthorizedKey(), within, "unknown"},
		{"empty list", "", within, "unknown"},
	} {
		list, err := signing.ParseAllowed("list", strings.NewReader(c.list), time.UTC)
		if err != nil {
			t.Fatal(err)
		}
		_, err = list.Find(key(t, "ed25519"), c.at)
		switch {
		case c.want == "" && err != nil,
			c.want == "unknown" && !errors.Is(err, signing.ErrUnknownKey),
			c.want != "" && c.want != "unknown" && (err == nil || !strings.Contains(err.Error(), c.want)):
			t.Errorf("%s: Find = %v, want %q", c.name, err, c.want)
		}
	}
}

// ssh_config(5), PATTERNS, and the principals line of `ssh-keygen -Y verify`.
func TestMatchPatternList(t *testing.T) {
	for _, c := range []struct {
		list, name string
		want       bool
	}{
		{"tech@example.org", "tech@example.org", true},
		{"tech@example.org", "Tech@example.org", false},
		{"*@example.org,!other@example.org", "tech@example.org", true},
		{"*@example.org,!other@example.org", "other@example.org", false},
		{"!other@example.org,*@example.org", "other@example.org", false},
		{"!other@example.org", "tech@example.org", false},
		{"192.168.0.?", "192.168.0.7", true},
		{"192.168.0.?", "192.168.0.77", false},
		{"a*b*c", "a-b-b-c", true},
		{"a*b*c", "a-b-b-d", false},
		{"*", "", true},
		{"", "", true},
		{"?", "", false},
		{strings.Repeat("*a", 40) + "b", strings.Repeat("a", 4000), false}, // quick, or the test never ends
	} {
		if got := signing.MatchPatternList(c.list, c.name); got != c.want {
			t.Errorf("MatchPatternList(%.40q, %.40q) = %v, want %v", c.list, c.name, got, c.want)
		}
	}
}
