module holdfast

go 1.26.0

require (
	codeberg.org/sbinet/npyio v0.14.0
	github.com/BurntSushi/toml v1.6.0
	github.com/mjibson/go-dsp v0.0.0-20180508042940-11479a337f12
	github.com/pmezard/go-difflib v1.0.0
	golang.org/x/term v0.48.0
	gonum.org/v1/gonum v0.17.0
)

require (
	github.com/nlpodyssey/gopickle v0.3.0 // indirect
	golang.org/x/sys v0.50.0 // indirect
	golang.org/x/text v0.34.0 // indirect
	golang.org/x/tools v0.51.0 // indirect
)
