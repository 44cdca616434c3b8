package design

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"math/rand/v2"
	"testing"
)

// benchmarkText is a text of n rows with two numbers and a code of 40 levels.
func benchmarkText(n int) []byte {
	rng := rand.New(rand.NewPCG(5, 1))
	var b bytes.Buffer
	b.WriteString("porosity,hold,furnace\n")
	for range n {
		fmt.Fprintf(&b, "%.6f,%.2f,F%d\n", rng.NormFloat64(), 10+20*rng.Float64(), 1+rng.IntN(40))
	}
	return b.Bytes()
}

func BenchmarkReadCSV(b *testing.B) {
	text := benchmarkText(1e6)
	late := append(bytes.Clone(text), "x,y,z\n"...) // every column turns to text at the end
	for _, c := range []struct {
		name string
		text []byte
	}{{"n=1e6/p=3", text}, {"n=1e6/p=3/late", late}} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			b.SetBytes(int64(len(c.text)))
			for b.Loop() {
				if _, err := ReadCSV(bytes.NewReader(c.text), nil); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
	b.Run("n=1e6/p=3/baseline", func(b *testing.B) { // cells only, by the standard library
		b.ReportAllocs()
		b.SetBytes(int64(len(text)))
		for b.Loop() {
			r := csv.NewReader(bytes.NewReader(text))
			r.ReuseRecord = true
			for {
				if _, err := r.Read(); err != nil {
					break
				}
			}
		}
	})
}

func BenchmarkFromStructs(b *testing.B) {
	type reading struct {
		Porosity, Hold float64
		Furnace        string
	}
	rows := make([]reading, 1e5)
	for i := range rows {
		rows[i] = reading{float64(i), float64(i % 30), "F" + fmt.Sprint(i%40)}
	}
	b.ReportAllocs()
	for b.Loop() {
		if _, err := FromStructs(rows); err != nil {
			b.Fatal(err)
		}
	}
}
