// Package syntax reads the text of a model file into a typed tree.
//
// It owns the grammar: lines and continuations, comments, statements, and
// expressions with the exact place of every part. It knows nothing of algebra
// or of what a statement means; a name that is not declared is no error here.
//
// Reading is a pipeline of three passes. [Parse] checks the text as a whole
// (size, encoding), cuts it into tokens grouped by statement, and parses each
// statement by its keyword. Expressions are handed to the parser of
// github.com/expr-lang/expr after a token pass that settles what that parser
// cannot know: differentials, whose factor may omit the multiplication sign;
// decimals, which stay exact; names that are words of its own language. The
// tree that comes back is translated to the node types of this package.
//
// [Format] lays out a file canonically and keeps its comments.
//
// Imports: the parser and syntax tree of expr, and the package diagnostic.
package syntax
