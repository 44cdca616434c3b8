package design_test

import (
	"errors"
	"fmt"
	"strings"

	"example.com/trammel/design"
)

func ExampleReadCSV() {
	const text = `porosity,hold,furnace,checked
1.52,20,F1,true
1.61,,F2,false
1.48,25,F1,true
`
	table, err := design.ReadCSV(strings.NewReader(text), nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, name := range table.Names() {
		c, _ := table.Column(name)
		fmt.Println(name, c.Kind(), c.Mask())
	}
	// Output:
	// porosity number []
	// hold number [false true false]
	// furnace text []
	// checked true/false []
}

func ExampleReadCSV_refused() {
	_, err := design.ReadCSV(strings.NewReader("hold,porosity\n20,1.52\n25\n"), nil)
	fmt.Println(err)
	fmt.Println(errors.Is(err, design.Code("row-length")))
	var refusal *design.Error
	if errors.As(err, &refusal) {
		fmt.Println("line", refusal.Line)
	}
	// Output:
	// design: line 3: the row has 1 cell and the header names 2 columns; give the row one cell per column; a cell with a separator in it stands in double quotes
	// true
	// line 3
}

func ExampleNewTable() {
	table, err := design.NewTable(
		design.Numbers("porosity", []float64{1.52, 1.61, 1.48}),
		design.Texts("furnace", []string{"F1", "", "F1"}).Missing([]bool{false, true, false}),
	)
	fmt.Println(table.Rows(), table.Names(), err)
	// Output: 3 [porosity furnace] <nil>
}

func ExampleFromStructs() {
	type reading struct {
		Porosity float64  `trammel:"porosity"`
		Hold     *float64 `trammel:"hold"` // nil is a missing cell
		Remark   string   `trammel:"-"`
	}
	hold := 20.0
	table, err := design.FromStructs([]reading{{1.52, &hold, "fine"}, {1.61, nil, ""}})
	if err != nil {
		fmt.Println(err)
		return
	}
	c, _ := table.Column("hold")
	fmt.Println(table.Names(), c.Floats(), c.Mask())
	// Output: [porosity hold] [20 NaN] [false true]
}
