"""Malformed model files, each with a word that the error must contain to name the place."""

GOOD = """
name = "chain"
sites = 3
boundary = "open"

[parameters]
delta = 0.5

[[hamiltonian]]
operator = "X X + Y Y + delta Z Z"

[[jump]]
operator = "Z"
on = "sites"
rate = 0.3
"""


def changed(old, new):
    """The good file with one passage replaced."""
    assert old in GOOD
    return GOOD.replace(old, new)


MALFORMED = {
    "empty file": ("", "name"),
    "not toml": ("name = = 3", "not valid TOML"),
    "unclosed string": (changed('"chain"', '"chain'), "not valid TOML"),
    "duplicate key": (changed("sites = 3", "sites = 3\nsites = 4"), "not valid TOML"),
    "no name": (changed('name = "chain"\n', ""), "name"),
    "blank name": (changed('"chain"', '"  "'), "name"),
    "long name": (changed('"chain"', '"' + "x" * 200 + '"'), "name"),
    "name is a number": (changed('"chain"', "7"), "name"),
    "no sites": (changed("sites = 3\n", ""), "sites"),
    "sites is text": (changed("sites = 3", 'sites = "3"'), "sites"),
    "sites is fractional": (changed("sites = 3", "sites = 3.5"), "sites"),
    "sites is true": (changed("sites = 3", "sites = true"), "sites"),
    "no site": (changed("sites = 3", "sites = 0"), "sites"),
    "negative sites": (changed("sites = 3", "sites = -2"), "sites"),
    "too many sites": (changed("sites = 3", "sites = 100000"), "sites"),
    "local dimension 1": (
        changed("sites = 3", "sites = 3\nlocal_dimension = 1"),
        "local_dimension",
    ),
    "local dimension 11": (
        changed("sites = 3", "sites = 3\nlocal_dimension = 11"),
        "local_dimension",
    ),
    "unknown boundary": (changed('"open"', '"opne"'), "did you mean 'open'"),
    "boundary is a list": (changed('"open"', '["open"]'), "boundary"),
    "ring of one site": (
        'name = "a"\nsites = 1\nboundary = "periodic"\n[[jump]]\noperator = "Z"\n',
        "ring",
    ),
    "unknown top key": (changed("sites = 3", "site = 3"), "did you mean 'sites'"),
    "unknown term key": (changed("rate = 0.3", "rates = 0.3"), "did you mean 'rate'"),
    "rate on a hamiltonian": (changed("[[jump]]", "[[hamiltonian]]"), "unknown key 'rate'"),
    "hamiltonian is a table": (changed("[[hamiltonian]]", "[hamiltonian]"), "[[hamiltonian]]"),
    "jump is text": ('name = "a"\nsites = 2\njump = "Z"\n', "[[jump]]"),
    "nothing to simulate": ('name = "a"\nsites = 2\n', "neither"),
    "parameters is a number": ('name = "a"\nsites = 2\nparameters = 3\n', "parameters"),
    "parameter is a list": (changed("delta = 0.5", "delta = [0.5]"), "delta"),
    "parameter is true": (changed("delta = 0.5", "delta = true"), "delta"),
    "parameter is nan": (changed("delta = 0.5", "delta = nan"), "delta"),
    "parameter is infinite": (changed("delta = 0.5", "delta = inf"), "delta"),
    "parameter named like an operator": (changed("delta = 0.5", "delta = 0.5\nX = 1.0"), "'X'"),
    "parameter named like a function": (changed("delta = 0.5", "delta = 0.5\nexp = 1.0"), "'exp'"),
    "parameter with a dash": (changed("delta = 0.5", 'delta = 0.5\n"a-b" = 1.0'), "a-b"),
    "unknown parameter": (changed("delta Z Z", "dleta Z Z"), "did you mean 'delta'"),
    "unknown operator": (changed('"Z"\n', '"W"\n'), "'W'"),
    "no operator": (changed('operator = "Z"\n', ""), "operator"),
    "two operators": (
        changed('operator = "Z"', 'operator = "Z"\nmatrix = [[1, 0], [0, 1]]'),
        "exactly",
    ),
    "operator is a number": (changed('operator = "Z"', "operator = 3"), "operator"),
    "operator is a scalar": (changed('operator = "Z"', 'operator = "3"'), "not an operator"),
    "empty expression": (changed('operator = "Z"', 'operator = ""'), "empty"),
    "mixed ranges": (changed("X X + Y Y + delta Z Z", "X X + Z"), "fill up with I"),
    "number plus operator": (changed('operator = "Z"', 'operator = "Z + 1"'), "multiply"),
    "star between operators": (changed('operator = "Z"', 'operator = "Z*Z"'), "ambiguous"),
    "number behind operator": (changed('operator = "Z"', 'operator = "Z 3"'), "in front"),
    "four sites": (changed("X X + Y Y + delta Z Z", "X X X X"), "at most 3"),
    "unclosed parenthesis": (changed('operator = "Z"', 'operator = "(Z"'), "parenthesis"),
    "deep parentheses": (
        changed('operator = "Z"', f'operator = "{"(" * 90}Z{")" * 90}"'),
        "deeper",
    ),
    "long expression": (changed('operator = "Z"', f'operator = "{"Z + " * 900}Z"'), "longer"),
    "attribute access": (changed("rate = 0.3", 'rate = "delta.real"'), "rate"),
    "index access": (changed("rate = 0.3", 'rate = "delta[0]"'), "not allowed"),
    "call of a parameter": (changed("rate = 0.3", 'rate = "__import__(1)"'), "__import__"),
    "division by zero": (changed("rate = 0.3", 'rate = "1/0"'), "zero"),
    "overflow": (changed("rate = 0.3", 'rate = "exp(1e6)"'), "exp"),
    "huge power": (changed("rate = 0.3", 'rate = "9**9**9"'), "rate"),
    "logarithm of zero": (changed("rate = 0.3", 'rate = "log(0)"'), "log"),
    "wrong number of arguments": (changed("rate = 0.3", 'rate = "sin(1, 2)"'), "argument"),
    "negative rate": (changed("rate = 0.3", "rate = -0.3"), "negative"),
    "complex rate": (changed("rate = 0.3", 'rate = "0.3 + 1j"'), "complex"),
    "rate is true": (changed("rate = 0.3", "rate = true"), "rate"),
    "rate is an operator": (changed("rate = 0.3", 'rate = "Z"'), "'Z'"),
    "rate list too short": (changed("rate = 0.3", "rate = [0.3, 0.2]"), "2 values for 3"),
    "empty rate list": (changed("rate = 0.3", "rate = []"), "empty"),
    "not Hermitian": (changed("X X + Y Y + delta Z Z", "S+ S-"), "not Hermitian"),
    "complex coefficient": (
        changed('operator = "X X', 'coefficient = "1j"\noperator = "X X'),
        "not Hermitian",
    ),
    "unknown place": (changed('on = "sites"', 'on = "sits"'), "did you mean 'sites'"),
    "place of another range": (changed('on = "sites"', 'on = "bonds"'), "bonds"),
    "site outside": (changed('on = "sites"', "on = [4]"), "outside 1 to 3"),
    "site zero": (changed('on = "sites"', "on = [0]"), "outside 1 to 3"),
    "site twice": (changed('on = "sites"', "on = [1, 1]"), "twice"),
    "site is text": (changed('on = "sites"', 'on = ["1"]'), "whole number"),
    "no place": (changed('on = "sites"', "on = []"), "on"),
    "term too long": (changed("sites = 3", "sites = 1"), "does not fit"),
    "matrix is a number": (changed('operator = "Z"', "matrix = 3"), "matrix"),
    "ragged matrix": (changed('operator = "Z"', "matrix = [[1, 0], [1]]"), "row 2"),
    "matrix of size 3": (
        changed('operator = "Z"', "matrix = [[1,0,0],[0,1,0],[0,0,1]]"),
        "size 3",
    ),
    "matrix entry true": (changed('operator = "Z"', "matrix = [[true, 0], [0, 1]]"), "row 1"),
    "matrix entry nan": (changed('operator = "Z"', "matrix = [[nan, 0], [0, 1]]"), "row 1"),
    "matrix entry unknown": (changed('operator = "Z"', 'matrix = [["q", 0], [0, 1]]'), "'q'"),
    "random without seed": (
        changed('operator = "Z"', 'random = {kind = "ginibre", range = 1}'),
        "seed",
    ),
    "random of unknown kind": (
        changed('operator = "Z"', 'random = {kind = "hermitain", range = 1, seed = 1}'),
        "did you mean 'hermitian'",
    ),
    "random with negative seed": (
        changed('operator = "Z"', 'random = {kind = "ginibre", range = 1, seed = -1}'),
        "seed",
    ),
    "random over four sites": (
        changed('operator = "Z"', 'random = {kind = "ginibre", range = 4, seed = 1}'),
        "range 4",
    ),
    "random range fractional": (
        changed('operator = "Z"', 'random = {kind = "ginibre", range = 1.5, seed = 1}'),
        "range 1.5",
    ),
    "random seed fractional": (
        changed('operator = "Z"', 'random = {kind = "ginibre", range = 1, seed = "delta"}'),
        "seed",
    ),
    "random is text": (changed('operator = "Z"', 'random = "ginibre"'), "random"),
    "unknown random key": (
        changed('operator = "Z"', 'random = {kind = "ginibre", range = 1, sead = 1}'),
        "did you mean 'seed'",
    ),
    "number glued to an operator": (changed('operator = "Z"', 'operator = "2Z"'), "'2Z'"),
    "exponent that hides an operator": (
        changed('operator = "Z"', 'operator = "0.5E01"'),
        "'0.5E01'",
    ),
    "two numbers side by side": (changed("rate = 0.3", 'rate = "0.5 0.3"'), "'0.3'"),
    "two signs": (changed("rate = 0.3", 'rate = "2*-1"'), "two signs"),
    "two powers": (changed("rate = 0.3", 'rate = "2^3^2"'), "two powers"),
    "imaginary unit i": (changed('operator = "Z"', 'operator = "i Z"'), "1j"),
    "function without argument": (changed("rate = 0.3", 'rate = "exp"'), "exp(...)"),
    "function of an operator": (changed('operator = "Z"', 'operator = "exp(Z) Z"'), "exp()"),
    "power of an operator": (changed('operator = "Z"', 'operator = "Z^0.5"'), "whole number"),
    "operator as exponent": (changed('operator = "Z"', 'operator = "2^Z"'), "exponent"),
    "division by an operator": (changed('operator = "Z"', 'operator = "1/Z"'), "division"),
    "dot between numbers": (changed('operator = "Z"', 'operator = "2 . Z"'), "dot"),
    "complex disorder": (changed("rate = 0.3", 'rate = "1 + random(1j, j)"'), "random"),
    "state outside": (changed('operator = "Z"', 'operator = "E02"'), "numbered 0 to 1"),
    "spin-1/2 operator on spin 1": (
        changed("sites = 3", "sites = 3\nlocal_dimension = 3"),
        "local dimension 2",
    ),
    "entries overflow": (
        changed('operator = "Z"', 'operator = "1e90 Z"\ncoefficient = 1e90'),
        "rescale",
    ),
    "rate overflows": (changed("rate = 0.3", "rate = 1e200"), "rescale"),
    "coefficient is nan": (changed("rate = 0.3", "coefficient = nan"), "coefficient"),
    "rate is a date": (changed("rate = 0.3", "rate = 1979-05-27"), "rate"),
    "rate is a table": (changed("rate = 0.3", "rate = {a = 1}"), "rate"),
    "impossible date": (changed("rate = 0.3", "rate = 1979-02-31"), "not valid TOML"),
    "sites of 5000 digits": (changed("sites = 3", "sites = 0x1" + "0" * 5000), "sites"),
    "site of 4000 digits": (changed('on = "sites"', "on = [" + "1" * 4000 + "]"), "outside"),
    "key over two lines": (changed("sites = 3", 'sites = 3\n"a\\nb" = 1'), "unknown key"),
    "place over two lines": (changed('on = "sites"', 'on = "a\\nb"'), "not a place"),
    "parameter over two lines": (
        changed("delta = 0.5", 'delta = 0.5\n"a\\nb" = 1'),
        "not a legal name",
    ),
    "name over two lines": (changed('"chain"', '"a\\nb"'), "name"),
    "description is a number": (changed("sites = 3", "sites = 3\ndescription = 4"), "description"),
    "parameter named sites": (changed("delta = 0.5", "delta = 0.5\nsites = 1.0"), "'sites'"),
    "parameter named S": (changed("delta = 0.5", "delta = 0.5\nS = 1.0"), "'S'"),
    "parameter is a date": (changed("delta = 0.5", "delta = 1979-05-27"), "delta"),
    "parameter of 400 digits": (changed("delta = 0.5", "delta = " + "9" * 400), "delta"),
    "parameter of another parameter": (
        changed("delta = 0.5", 'delta = 0.5\ntwice = "2*delta"'),
        "uses the parameter 'delta'",
    ),
    "deep lists": (changed("rate = 0.3", "rate = " + "[" * 2000 + "]" * 2000), "not valid TOML"),
    "nested rate list": (changed("rate = 0.3", "rate = [[0.3], [0.2], [0.1]]"), "entry 1"),
    "about is text": ("about = 'x'\n" + GOOD, "about"),
    "unknown about key": (GOOD + "\n[about]\ntitel = 'x'\n", "did you mean 'title'"),
}
