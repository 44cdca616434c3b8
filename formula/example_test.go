package formula_test

import (
	"errors"
	"fmt"

	"example.com/trammel/formula"
)

func ExampleParse() {
	m, err := formula.Parse("porosity ~ hold * cat(furnace against 'F2')  # straight lines, one per furnace")
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(m)

	_, err = formula.Parse("porosity ~ hold^2 + cat(furnace)")
	fmt.Println(err)

	var refusal *formula.Error
	if errors.As(err, &refusal) {
		fmt.Println(refusal.Code, refusal.Span)
	}
	// Output:
	// porosity ~ hold*cat(furnace against 'F2')
	// formula: 1:12: ^ is arithmetic and cannot stand between terms; write num(hold^2)
	//     porosity ~ hold^2 + cat(furnace)
	//                ^^^^^^
	// arithmetic-in-terms {11 17}
}

func ExampleParseCoef() {
	c, err := formula.ParseCoef("hold by furnace='F2'")
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, part := range c.Parts {
		switch {
		case part.Value != nil:
			fmt.Println("slope of", part.Value)
		case part.Cell != nil:
			fmt.Println("level", part.Cell[0].Level.Text, "of", part.Cell[0].Column)
		}
	}
	// Output:
	// slope of hold
	// level F2 of furnace
}

func ExampleQuoteName() {
	for _, column := range []string{"hold", "Hold time (min)", "start"} {
		fmt.Println("porosity ~ " + formula.QuoteName(column))
	}
	// Output:
	// porosity ~ hold
	// porosity ~ "Hold time (min)"
	// porosity ~ "start"
}
