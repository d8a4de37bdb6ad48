package quantity

import (
	"testing"
	"time"
)

func TestBytes(t *testing.T) {
	for _, c := range []struct {
		text string
		want int64
	}{
		{"120MB", 120e6}, {"1GiB", 1 << 30}, {"1.5 GiB", 3 << 29}, {"4096", 4096}, {"1b", 1}, {" 2kB ", 2000}, {"1e3KiB", 1024000},
		{"", 0}, {"MB", 0}, {"12XB", 0}, {"-1GB", 0}, {"0", 0}, {"1e30GB", 0}, {"NaN", 0}, {"Inf", 0}, {"12M", 0}, {"0.1B", 0}, {"1 GB more", 0},
	} {
		got, err := Bytes(c.text)
		if (err == nil) != (c.want != 0) || got != c.want {
			t.Errorf("Bytes(%q) = %d, %v, want %d", c.text, got, err, c.want)
		}
	}
}

func TestDuration(t *testing.T) {
	for _, c := range []struct {
		text string
		want time.Duration
	}{
		{"10m", 10 * time.Minute}, {"1h30m", 90 * time.Minute}, {"90s", 90 * time.Second}, {"0.5s", time.Second / 2}, {"90", 0}, {"0", 0},
		{"", 0}, {"soon", 0}, {"0s", 0}, {"-3s", 0}, {"NaN", 0}, {"1e300", 0},
	} {
		got, err := Duration(c.text)
		if (err == nil) != (c.want != 0) || got != c.want {
			t.Errorf("Duration(%q) = %v, %v, want %v", c.text, got, err, c.want)
		}
	}
}

func TestText(t *testing.T) {
	for _, c := range []struct {
		bytes int64
		want  string
	}{{0, "0 bytes"}, {999, "999 bytes"}, {1000, "1 kB"}, {1234567890, "1.23 GB"}, {999999, "1 MB"}} {
		if got := Text(c.bytes); got != c.want {
			t.Errorf("Text(%d) = %q, want %q", c.bytes, got, c.want)
		}
	}
}

func FuzzBytes(f *testing.F) {
	f.Add("120MB")
	f.Add("1e9TiB")
	f.Fuzz(func(t *testing.T, text string) {
		if n, err := Bytes(text); err == nil && n < 1 {
			t.Errorf("Bytes(%q) = %d", text, n)
		}
	})
}
