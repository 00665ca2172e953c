// Package block holds block-sparse tensors with abelian charges.
package block
