package page

import _ "embed"

// style is the style sheet: light and dark, screen and paper.
//
//go:embed page.css
var style string

// script adds a button to each formula that copies its TeX. Without it the page lacks nothing else.
//
//go:embed page.js
var script string
