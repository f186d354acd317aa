"""The invented ocean: one set of formulas, any grid, any model's clothes.

How it is invented. Land is the union of thick brush strokes along great circles, its outline bent by ripples: sums of
plane waves cut by the sphere, whose directions and phases follow irrational steps instead of random numbers. The
distance from the coast gives shelf, slope, trench and abyss. A tilted plane parts the young ocean from the old one.
Each water column is a set of exponentials and humps of one *origin depth*, which the mixed layer flattens and upwelling
raises, so that all tracers move together and the water stays stably layered. The surface follows a climate bent by
gyres and meanders; a warm, biologically drawn down cap comes with every summer; carbon from the air grows by a factor e
in 50 years and goes deep where water is young; a river dilutes everything with its own water. Every formula stands in
the docstring of its function, and a test can work out a cell by hand.

`geography` names the places; `ocean.state` gives the tracers at a point; `grids.sample` puts them on a grid;
`clothes.dress` writes them as a model would; `make` writes the committed files (`python -m synthetic_grids`). `kinds`
lists every kind of file that the tests write for themselves; a kind is a `scene` of a mesh (`plain_meshes`, `planes`,
`unstructured`), a vertical coordinate (`uprights`, `parametric`) and `times`, in some `masks` and `forms`, with
`measures` beside it. All kinds share the `landmarks`. Nothing here imports gridcarb: the truth must not depend on what
is tested with it.
"""
