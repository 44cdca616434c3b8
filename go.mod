module example.com/trammel

go 1.26.0

require (
	github.com/alecthomas/participle/v2 v2.1.4
	gonum.org/v1/gonum v0.17.0
)

require golang.org/x/text v0.44.0

require golang.org/x/tools v0.52.0 // indirect
