package linfit_test

import (
	"context"
	"fmt"
	"strings"

	"example.com/trammel/design"
	"example.com/trammel/linfit"
)

func ExampleFit() {
	table, err := design.ReadCSV(strings.NewReader(`hold,furnace,porosity
10,F1,31
20,F1,29
30,F1,27
10,F2,34
20,F2,31
30,F2,28
`), nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	result, err := linfit.Fit(context.Background(), "porosity ~ hold * cat(furnace)", table, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	for j, column := range result.Plan().Columns() {
		fmt.Printf("%s: %.1f\n", column.Name, result.Estimates()[j])
	}
	// Output:
	// intercept: 33.0
	// hold: -0.2
	// furnace='F2': 4.0
	// hold by furnace='F2': -0.1
}
