package chlog_test

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/record"
	"chargehand/commission/signing"
)

func allow(t testing.TB, lines ...string) *signing.Allowed {
	t.Helper()
	list, err := signing.ParseAllowed("allowed_signers", strings.NewReader(strings.Join(lines, "\n")), time.UTC)
	if err != nil {
		t.Fatal(err)
	}
	return list
}

func now() time.Time { return chlogtest.Start.AddDate(1, 0, 0) }

// wantReport compares the outcome, the exit code and a piece of the sentence.
func wantReport(t *testing.T, r chlog.Report, outcome chlog.Outcome, exit int, pieces ...string) {
	t.Helper()
	if r.Outcome != outcome || r.Exit != exit {
		t.Errorf("Verify = %s, exit %d (%s), want %s, exit %d", r.Outcome, r.Exit, r, outcome, exit)
	}
	for _, p := range pieces {
		if !strings.Contains(r.String(), p) {
			t.Errorf("Verify says %q, want %q in it", r, p)
		}
	}
}

func read(t testing.TB, path string) []byte {
	t.Helper()
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func write(t testing.TB, path string, b []byte) {
	t.Helper()
	if err := os.WriteFile(path, b, 0o644); err != nil {
		t.Fatal(err)
	}
}

func TestVerifySaysWhatTheTableSays(t *testing.T) {
	key, other := chlogtest.Key(t), chlogtest.Key(t)
	known := "tech@example.org " + key.AuthorizedKey()
	t.Run("all well, known signer", func(t *testing.T) {
		r := chlog.Verifier{Signers: allow(t, known), Now: now}.File(chlogtest.Sealed(t, record.SiteMode, key))
		wantReport(t, r, chlog.Unchanged, 0, "unchanged since tech@example.org (A. Example, technician) signed; complete to the seal")
		if strings.Contains(r.String(), "REHEARSAL") {
			t.Errorf("Verify of a log from a site says %q", r)
		}
	})
	t.Run("no list", func(t *testing.T) {
		r := chlog.Verifier{Now: now}.File(chlogtest.Sealed(t, record.SiteMode, key))
		wantReport(t, r, chlog.Consistent, 0, "consistent, signed by key "+key.Fingerprint()+"; identity not checked")
	})
	t.Run("key not on the list", func(t *testing.T) {
		r := chlog.Verifier{Signers: allow(t, "x@example.org "+other.AuthorizedKey()), Now: now}.File(chlogtest.Sealed(t, record.SiteMode, key))
		wantReport(t, r, chlog.UnknownKey, 1, "valid signature of an unknown key at record 5", key.Fingerprint())
	})
	t.Run("key expired at the claimed time", func(t *testing.T) {
		list := allow(t, `tech@example.org valid-before="20261130Z" `+key.AuthorizedKey())
		r := chlog.Verifier{Signers: list, Now: now}.File(chlogtest.Sealed(t, record.SiteMode, key))
		wantReport(t, r, chlog.NotPermitted, 1, "expired on 2026-11-30T00:00:00Z", "claimed time")
	})
	t.Run("key expired since", func(t *testing.T) {
		list := allow(t, `tech@example.org valid-before="20261202Z" `+key.AuthorizedKey())
		r := chlog.Verifier{Signers: list, Now: now}.File(chlogtest.Sealed(t, record.SiteMode, key))
		wantReport(t, r, chlog.Unchanged, 0)
	})
	t.Run("key for another namespace", func(t *testing.T) {
		list := allow(t, `tech@example.org namespaces="git" `+key.AuthorizedKey())
		r := chlog.Verifier{Signers: list, Now: now}.File(chlogtest.Sealed(t, record.SiteMode, key))
		wantReport(t, r, chlog.NotPermitted, 1, `not permitted for the namespace "chargehand", only for "git"`)
	})
	t.Run("rehearsal", func(t *testing.T) {
		path := chlogtest.Sealed(t, record.RehearsalMode, key)
		r := chlog.Verifier{Signers: allow(t, known), Now: now}.File(path)
		wantReport(t, r, chlog.Unchanged, 0)
		for name, change := range map[string]func([]byte) []byte{
			"whole":            func(b []byte) []byte { return b },
			"seal cut":         func(b []byte) []byte { return b[:bytes.LastIndexByte(b[:len(b)-1], '\n')+1] },
			"first byte wrong": func(b []byte) []byte { return append([]byte("["), b[1:]...) },
			"torn":             func(b []byte) []byte { return b[:len(b)-5] },
			"mode forged": func(b []byte) []byte {
				return rechain(bytes.Replace(b, []byte(`"mode":"rehearsal"`), []byte(`"mode":"site"`), 1))
			},
		} {
			changed := filepath.Join(t.TempDir(), "wagtail.chlog")
			write(t, changed, change(read(t, path)))
			if r := (chlog.Verifier{Now: now}).File(changed); !strings.HasPrefix(r.String(), "REHEARSAL ") || !r.Rehearsal {
				t.Errorf("%s: Verify says %q, want REHEARSAL first", name, r)
			}
		}
	})
	t.Run("chain rebuilt by another", func(t *testing.T) {
		path := chlogtest.Sealed(t, record.SiteMode, key)
		write(t, path, rechain(bytes.Replace(read(t, path), []byte(`"result":"pass"`), []byte(`"result":"fail"`), 1)))
		r := chlog.Verifier{Signers: allow(t, known), Now: now}.File(path)
		wantReport(t, r, chlog.OtherHistory, 1, "intact chain, signature at record 5 (byte", "is for another history", `"head: `)
	})
	t.Run("statement rebuilt too", func(t *testing.T) {
		path := chlogtest.Sealed(t, record.SiteMode, key)
		forged := bytes.Replace(read(t, path), []byte(`"result":"pass"`), []byte(`"result":"fail"`), 1)
		write(t, path, rechainWithStatements(forged))
		r := chlog.Verifier{Signers: allow(t, known), Now: now}.File(path)
		wantReport(t, r, chlog.OtherHistory, 1, "signature at record 5 (byte", "does not fit its statement")
	})
	t.Run("seal cut", func(t *testing.T) {
		path := chlogtest.Sealed(t, record.SiteMode, key)
		b := read(t, path)
		write(t, path, b[:bytes.LastIndexByte(b[:len(b)-1], '\n')+1])
		os.Remove(path + ".sig")
		r := chlog.Verifier{Now: now}.File(path)
		wantReport(t, r, chlog.Unsealed, 1, "intact to 6; signed to 5; cannot tell what followed")
	})
	t.Run("seal cut, signature still there", func(t *testing.T) {
		path := chlogtest.Sealed(t, record.SiteMode, key)
		b := read(t, path)
		write(t, path, b[:bytes.LastIndexByte(b[:len(b)-1], '\n')+1])
		r := chlog.Verifier{Now: now}.File(path)
		wantReport(t, r, chlog.BadSignature, 1, "intact chain to record 6 without a seal, signed to 5", "wagtail.chlog.sig does not hold")
	})
	t.Run("last line torn", func(t *testing.T) {
		path := chlogtest.Sealed(t, record.SiteMode, key)
		b := read(t, path)
		write(t, path, b[:len(b)-1])
		r := chlog.Verifier{Now: now}.File(path)
		wantReport(t, r, chlog.Unsealed, 1, "intact to record 6; signed to 5; cannot tell what followed",
			fmt.Sprintf("first wrong byte at offset %d (record 7, line 8)", len(b)-1))
	})
	t.Run("signature missing", func(t *testing.T) {
		path := chlogtest.Sealed(t, record.SiteMode, key)
		os.Remove(path + ".sig")
		r := chlog.Verifier{Now: now}.File(path)
		wantReport(t, r, chlog.SignatureMissing, 1, "the seal's statement holds", "nothing else vouches for the last line")
	})
	t.Run("countersigned", func(t *testing.T) {
		path := chlogtest.Sealed(t, record.SiteMode, key)
		name, err := chlog.SignFile(path, other)
		if err != nil || filepath.Base(name) != "wagtail.chlog.2.sig" {
			t.Fatalf("SignFile = %s, %v, want wagtail.chlog.2.sig", name, err)
		}
		if _, err := chlog.SignFile(path, other); err == nil {
			t.Errorf("SignFile by the same key again = nil, want an error")
		}
		r := chlog.Verifier{Signers: allow(t, known, "surveyor@example.org "+other.AuthorizedKey()), Now: now}.File(path)
		wantReport(t, r, chlog.Unchanged, 0, "unchanged since tech@example.org (A. Example, technician) and surveyor@example.org (role not stated) signed")
		write(t, name, read(t, path+".sig")[:40])
		wantReport(t, chlog.Verifier{Now: now}.File(path), chlog.BadSignature, 1, "wagtail.chlog.2.sig does not hold: malformed signature")
	})
	t.Run("fork", func(t *testing.T) {
		path := chlogtest.Sealed(t, record.SiteMode, key)
		b := read(t, path)
		lines := bytes.SplitAfter(b, []byte("\n"))
		second := filepath.Join(t.TempDir(), "second.chlog")
		write(t, second, bytes.Join(lines[:4], nil))
		w, _, err := chlog.Resume(chlog.Disk{}, second, chlogtest.Options())
		if err != nil {
			t.Fatal(err)
		}
		w.Close()
		rs := chlog.Verifier{Now: now}.Verify(t.Context(), []string{path, second})
		wantReport(t, rs[0], chlog.Forked, 1, "fork after record 3: second.chlog")
		wantReport(t, rs[1], chlog.Unsealed, 1)
		if !strings.Contains(strings.Join(rs[1].Notes, "\n"), "fork after record 3: wagtail.chlog") {
			t.Errorf("Notes = %q, want the fork", rs[1].Notes)
		}
		if worst := chlog.Worst(rs); worst != 1 {
			t.Errorf("Worst = %d, want 1", worst)
		}
	})
	t.Run("shorter copy", func(t *testing.T) {
		path := chlogtest.Sealed(t, record.SiteMode, key)
		lines := bytes.SplitAfter(read(t, path), []byte("\n"))
		short := filepath.Join(t.TempDir(), "short.chlog")
		write(t, short, bytes.Join(lines[:4], nil))
		rs := chlog.Verifier{Now: now}.Verify(t.Context(), []string{path, short})
		wantReport(t, rs[0], chlog.Consistent, 0)
		if got := strings.Join(rs[1].Notes, ""); got != "the beginning of wagtail.chlog, which goes on with record 4" {
			t.Errorf("Notes = %q", got)
		}
	})
	for name, c := range map[string]struct {
		text    string
		outcome chlog.Outcome
		exit    int
		says    string
	}{
		"empty":           {"", chlog.NotALog, 2, "the file is empty"},
		"binary":          {"\x7fELF\x02\x01\x01\x00", chlog.NotALog, 2, "not a chargehand log"},
		"other JSON":      {`{"level":"info"}` + "\n", chlog.NotALog, 2, "JSON of another kind"},
		"newer":           {`{"prev":"` + chlog.NoPrev + `","seq":0,"at":"x","kind":"opened","body":{"format":"chargehand-log/2","x":1}}` + "\n", chlog.NewerVersion, 2, `"chargehand-log/2"`},
		"newer, reshaped": {`{"format":"chargehand-log/12","sha512":"…"}` + "\n", chlog.NewerVersion, 2, `"chargehand-log/12"`},
	} {
		t.Run(name, func(t *testing.T) {
			path := filepath.Join(t.TempDir(), "x.chlog")
			write(t, path, []byte(c.text))
			wantReport(t, chlog.Verifier{Now: now}.File(path), c.outcome, c.exit, c.says)
		})
	}
	t.Run("not there", func(t *testing.T) {
		wantReport(t, chlog.Verifier{Now: now}.File(filepath.Join(t.TempDir(), "none.chlog")), chlog.Unreadable, 2)
	})
	t.Run("as JSON", func(t *testing.T) {
		b, err := json.Marshal(chlog.Verifier{Now: now}.File(chlogtest.Sealed(t, record.RehearsalMode, key)))
		if err != nil || !bytes.Contains(b, []byte(`"format":"chargehand-verify/1"`)) || !bytes.Contains(b, []byte(`"rehearsal":true`)) {
			t.Errorf("Marshal = %s, %v", b, err)
		}
	})
}

// What stands beside a good log can be bad in its own ways: a sentence and exit 1 for each, never a panic.
func TestVerifyOfBadSignaturesBesideAGoodLog(t *testing.T) {
	key, other := chlogtest.Key(t), chlogtest.Key(t)
	path := chlogtest.Sealed(t, record.SiteMode, key)
	good := string(read(t, path+".sig"))
	foreign, err := other.Sign([]byte("another file"))
	if err != nil {
		t.Fatal(err)
	}
	for name, c := range map[string]struct{ text, says string }{
		"trailing text":     {good + "approved\n", "text after -----END SSH SIGNATURE-----"},
		"leading text":      {"approved\n" + good, "does not begin with"},
		"empty":             {"", "does not begin with"},
		"cut":               {good[:100], "no line -----END"},
		"of another file":   {foreign, "it is not for these bytes"},
		"another namespace": {string(read(t, "../signing/testdata/message.namespace.sig")), `for namespace "git", not "chargehand"`},
	} {
		t.Run(name, func(t *testing.T) {
			write(t, path+".sig", []byte(c.text))
			wantReport(t, chlog.Verifier{Now: now}.File(path), chlog.BadSignature, 1, "intact chain to record 7, but wagtail.chlog.sig does not hold", c.says)
		})
	}
	write(t, path+".sig", []byte(good))
	if _, err := chlog.SignFile(path, other); err != nil {
		t.Fatal(err)
	}
	list := allow(t, "tech@example.org "+key.AuthorizedKey(), `surveyor@example.org valid-before="20261215Z" `+other.AuthorizedKey())
	wantReport(t, chlog.Verifier{Signers: list, Now: now}.File(path), chlog.NotPermitted, 1, "wagtail.chlog.2.sig", "today, since a detached signature carries no time")
}

func TestVerifyOfSignOffs(t *testing.T) {
	key, other := chlogtest.Key(t), chlogtest.Key(t)
	v := chlog.Verifier{Now: now}
	t.Run("a witness without a key", func(t *testing.T) {
		w := chlogtest.Begin(t, record.SiteMode, key)
		chlogtest.Append(t, w, record.Person{ID: "p2", Name: "B. Example", Role: "witness"})
		if _, err := w.SignOff("p2", "charge.curve", nil, ""); err != chlog.ErrUnsigned {
			t.Errorf("SignOff without a key or a reason = %v, want ErrUnsigned", err)
		}
		if _, err := w.SignOff("p2", "charge.curve", nil, "no key at hand"); err != nil {
			t.Fatal(err)
		}
		if _, err := w.SignOff("p1", "charge.curve", other, ""); err == nil {
			t.Error("SignOff with another key than the person's = nil, want an error")
		}
		if _, err := w.SignOff("p7", "charge.curve", key, ""); err == nil {
			t.Error("SignOff by nobody = nil, want an error")
		}
		if _, err := w.Seal("p1", "pass", nil, "key left at home"); err != nil {
			t.Fatal(err)
		}
		wantReport(t, v.File(w.Path()), chlog.SealUnsigned, 1, "intact to the seal at record 4, which nobody's key signed (key left at home); signed nowhere")
		if _, err := chlog.SignFile(w.Path(), key); err != nil {
			t.Fatal(err)
		}
		r := v.File(w.Path())
		wantReport(t, r, chlog.Consistent, 0)
		if len(r.Notes) != 2 || r.Notes[0] != "record 3: p2 B. Example did not sign: no key at hand" {
			t.Errorf("Notes = %q, want both that are not signed", r.Notes)
		}
	})
	t.Run("another key in a person's name", func(t *testing.T) {
		w := chlogtest.Begin(t, record.SiteMode, key)
		if _, err := w.AppendSigned(func(seq int64, head string, at time.Time) (record.Body, error) {
			text, err := chlog.Statement{Log: chlogtest.ID, Mode: record.SiteMode, Act: chlog.ActSignOff, Point: "charge.curve", Record: seq, Head: head, At: chlog.FormatTime(at),
				Person: record.Person{ID: "p1", Name: "A. Example", Role: "technician"}}.Text()
			if err != nil {
				return nil, err
			}
			signature, err := other.Sign([]byte(text))
			return record.SignOff{Person: "p1", Point: "charge.curve", Statement: text, Signature: signature}, err
		}); err != nil {
			t.Fatal(err)
		}
		wantReport(t, v.File(w.Path()), chlog.OtherHistory, 1, "signature at record 2", "p1 is entered with key "+key.Fingerprint()+", and another key signed")
	})
	t.Run("a name with a line of its own", func(t *testing.T) {
		w := chlogtest.Begin(t, record.SiteMode, key)
		chlogtest.Append(t, w, record.Person{ID: "p2", Name: "B.\nact: seal", Role: "witness"})
		if _, err := w.SignOff("p2", "charge.curve", nil, "no key"); err == nil {
			t.Error("SignOff by a person with a line feed in the name = nil, want an error")
		}
	})
	t.Run("a log that is not finished", func(t *testing.T) {
		w := chlogtest.Begin(t, record.SiteMode, key)
		if _, err := chlog.SignFile(w.Path(), key); err == nil || !strings.Contains(err.Error(), "without a seal") {
			t.Errorf("SignFile of an open log = %v, want a NotSealedError", err)
		}
		wantReport(t, v.File(w.Path()), chlog.Unsealed, 1, "intact to 1; signed nowhere; cannot tell what followed")
	})
}

func TestVerifyManyAtOnce(t *testing.T) {
	key := chlogtest.Key(t)
	var paths []string
	for i := range 12 {
		path := chlogtest.Sealed(t, record.SiteMode, key)
		b := read(t, path)
		if i == 7 {
			b[len(b)/2] ^= 1
		}
		write(t, path, b)
		paths = append(paths, path)
	}
	paths = append(paths, filepath.Join(t.TempDir(), "none.chlog"), t.TempDir())
	var done, total atomic.Int64
	v := chlog.Verifier{Now: now, Progress: func(d, n int64) { done.Store(max(d, done.Load())); total.Store(n) }}
	reports := v.Verify(t.Context(), paths)
	for i, r := range reports {
		want := 0
		switch {
		case i == 7:
			want = 1
		case i >= 12:
			want = 2
		}
		if r.File != paths[i] || r.Exit != want {
			t.Errorf("report %d = %s, exit %d, want %d", i, r, r.Exit, want)
		}
	}
	if chlog.Worst(reports) != 2 || chlog.Worst(reports[:12]) != 1 || chlog.Worst(nil) != 0 {
		t.Errorf("Worst = %d, want 2", chlog.Worst(reports))
	}
	if done.Load() > total.Load() || total.Load() == 0 {
		t.Errorf("progress told of %d of %d bytes", done.Load(), total.Load())
	}
	ended, cancel := context.WithCancel(t.Context())
	cancel()
	if r := v.Verify(ended, paths[:1])[0]; r.Outcome != chlog.Unreadable || !errors.Is(r.Err(), context.Canceled) {
		t.Errorf("Verify after cancel = %s, want unreadable", r)
	}
}

func TestReadFileGivesTheIntactLines(t *testing.T) {
	path := chlogtest.Sealed(t, record.SiteMode, chlogtest.Key(t))
	all, err := chlog.ReadFile(path)
	if err != nil || len(all) != 8 {
		t.Fatalf("ReadFile = %d lines, %v, want 8", len(all), err)
	}
	b := read(t, path)
	write(t, path, b[:len(b)-4])
	all, err = chlog.ReadFile(path)
	if damage, ok := errors.AsType[*chlog.DamageError](err); !ok || damage.Record != 7 || len(all) != 7 {
		t.Errorf("ReadFile of a torn log = %d lines, %v, want 7 and the damage", len(all), err)
	}
}
