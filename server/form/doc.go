// Package form stands between what a person types and the document: it makes a
// document of the texts of a form, whose field names are the JSON Pointers of the
// format, and form texts of a document. What it cannot read it hands on as text, so
// that the one reader in sizing/design judges forms as it judges files; nothing that
// was typed is lost on the way.
//
// It knows how numbers are typed and which fields there are. It must not know what
// a field is called on the page, what a request is, or whether a design is sound.
package form
