package scenario

import (
	"bytes"
	"os"
	"testing"
)

// TestFiles holds that the committed files are what the generator makes;
// TRAMMEL_UPDATE=1 writes them anew.
func TestFiles(t *testing.T) {
	for name, make := range map[string]func() []byte{"furnaces.csv": Furnaces, "shrinkage.csv": Shrinkage} {
		path := "../../testdata/" + name
		if os.Getenv("TRAMMEL_UPDATE") != "" {
			if err := os.WriteFile(path, make(), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		got, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(got, make()) {
			t.Errorf("%s is not what the generator makes; run this test with TRAMMEL_UPDATE=1", name)
		}
	}
}
