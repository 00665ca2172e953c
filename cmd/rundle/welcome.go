package main

const welcome = `rundle: from a ladder Hamiltonian in a model file to its ground state

  rundle check FILE        what the model means: unit cell, terms, charges, cost
  rundle solve FILE        ground state, observations with error bars, entanglement
  rundle read DIR [FILE]   observe the states of a run again
  rundle version           version, build, kernels

Model files are TOML; the bundled ones lie in examples/. A run keeps its results beside
the model file, in a folder of the same name with .run; stop it any time, the same command goes on.

Try: rundle solve examples/frustrated-ladder/model.toml
`
