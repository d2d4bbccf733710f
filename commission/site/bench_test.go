package site

import "testing"

func BenchmarkRead(b *testing.B) {
	text := []byte(load(b, "wagtail.site.toml"))
	b.ReportAllocs()
	for b.Loop() {
		if _, _, err := Read("x", text); err != nil {
			b.Fatal(err)
		}
	}
}
