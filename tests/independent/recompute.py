"""Recomputes the quantities of a report from its derivation.json, with nothing but Python's own library.

    python3 recompute.py derivation.json results.json

Each node is computed again from its operands with Python's own elementary functions and sums. An estimator that is
linear in its last column (a mean, an elimination of drift, a least-squares fit) is computed again from its Jacobian and
that column. Then every standard uncertainty in results.json is propagated again, by a reverse sweep over the nodes.
Prints one line of counts and largest relative differences; exits with 1 where one exceeds its tolerance.
"""

import json
import math
import sys

VALUE_TOLERANCE = 1e-12
UNCERTAINTY_TOLERANCE = 1e-9

ONE = {
    "negate": (lambda x: -x, lambda x, y: -1.0),
    "square_root": (math.sqrt, lambda x, y: 0.5 / y),
    "exp": (math.exp, lambda x, y: y),
    "ln": (math.log, lambda x, y: 1.0 / x),
    "sin": (math.sin, lambda x, y: math.cos(x)),
    "cos": (math.cos, lambda x, y: -math.sin(x)),
    "tan": (math.tan, lambda x, y: 1.0 + y * y),
    "asin": (math.asin, lambda x, y: 1.0 / math.sqrt(1.0 - x * x)),
    "acos": (math.acos, lambda x, y: -1.0 / math.sqrt(1.0 - x * x)),
    "atan": (math.atan, lambda x, y: 1.0 / (1.0 + x * x)),
}
TWO = {
    "add": lambda a, b: a + b,
    "subtract": lambda a, b: a - b,
    "multiply": lambda a, b: a * b,
    "divide": lambda a, b: a / b,
}


def rows(value):
    return value if isinstance(value, list) else [value]


def pairs(function, a, b):
    if not isinstance(a, list) and not isinstance(b, list):
        return function(a, b)
    length = len(a) if isinstance(a, list) else len(b)
    at = lambda value, index: value[index] if isinstance(value, list) else value
    return [function(at(a, index), at(b, index)) for index in range(length)]


class Graph:
    def __init__(self, derivation):
        self.nodes = derivation["nodes"]
        self.estimators = derivation["estimators"]
        self.values = []
        self.recomputed = 0
        self.worst = 0.0
        self.where = ""
        for node in self.nodes:
            self.values.append(self.compute(node))

    def compute(self, node):
        word, given = node["operation"], node["value"]
        operands = [self.values[index] for index in node.get("of", [])]
        if word in ("input", "constant") or given is None or isinstance(given, dict):
            return given
        if any(operand is None or isinstance(operand, dict) for operand in operands):
            return given
        if word in TWO:
            found = pairs(TWO[word], *operands)
        elif word in ONE:
            function = ONE[word][0]
            found = [function(x) for x in operands[0]] if isinstance(operands[0], list) else function(operands[0])
        elif word == "power":
            exponent = node["exponent"]
            raised = lambda x: x**exponent
            found = [raised(x) for x in operands[0]] if isinstance(operands[0], list) else raised(operands[0])
        elif word == "sum":
            found = math.fsum(rows(operands[0]))
        elif word == "row":
            found = rows(operands[0])[node["row"]]
        elif word == "mix":
            source = rows(operands[0])
            found = [math.fsum(weight * source[index] for index, weight in row) for row in node["weights"]]
        elif word == "stack":
            found = list(operands)
        elif word == "output":
            found = self.estimate(node)
            if found is None:
                return given
        else:
            raise ValueError(f"unknown operation {word}")
        self.compare(node, found, given, operands)
        # What follows rests on the values recomputed here.
        return found

    def estimate(self, node):
        """The output of an estimator that is linear in its last column; nothing for one that only describes."""
        estimator = self.estimators[node["estimator"]]
        if estimator["jacobian"] is None:
            return None
        slopes = estimator["jacobian"][-1][node["output"]]
        column = self.values[estimator["columns"][-1]]
        if not any(slopes) or column is None or isinstance(column, dict):
            return None
        values = rows(column)
        total = math.fsum(slopes)
        # A weighted mean is summed about its first reading, so that no digits are lost.
        if abs(total - 1.0) < 1e-9:
            return values[0] + math.fsum(slope * (value - values[0]) for slope, value in zip(slopes, values))
        return math.fsum(slope * value for slope, value in zip(slopes, values))

    def compare(self, node, found, given, operands):
        """Relative to the largest number that met in the operation: a difference of near values has fewer digits."""
        size = [abs(x) for operand in operands for x in rows(operand)] if node["operation"] in ("add", "subtract") else []
        if node["operation"] == "output":
            estimator = self.estimators[node["estimator"]]
            slopes = estimator["jacobian"][-1][node["output"]]
            column = rows(self.values[estimator["columns"][-1]])
            size = [math.fsum(abs(slope * value) for slope, value in zip(slopes, column))]
        scale = max(size, default=0.0)
        for one, other in zip(rows(found), rows(given)):
            largest = max(abs(other), scale)
            difference = abs(one - other) / largest if largest else abs(one - other)
            if difference > self.worst:
                self.worst, self.where = difference, node.get("name", f"node {node['id']}")
        self.recomputed += 1

    def uncertainty(self, measurand):
        """The standard uncertainty of a scalar node by a reverse sweep."""
        adjoint = {measurand: [1.0]}
        variance = []
        by_estimator = {}
        for index in range(measurand, -1, -1):
            weights = adjoint.pop(index, None)
            if weights is None:
                continue
            node = self.nodes[index]
            word, operands = node["operation"], node.get("of", [])
            value = self.values[index]
            if word == "input":
                u = node.get("standard_uncertainty", 0.0)
                variance.extend((weight * u) ** 2 for weight in weights)
            elif word == "constant":
                continue
            elif word == "output":
                by_estimator.setdefault(node["estimator"], {})[node["output"]] = weights[0]
                estimator = self.estimators[node["estimator"]]
                if estimator["jacobian"] is None:
                    return None
                for place, column in enumerate(estimator["columns"]):
                    slopes = estimator["jacobian"][place][node["output"]]
                    self.give(adjoint, column, [weights[0] * slope for slope in slopes])
            elif word == "sum":
                self.give(adjoint, operands[0], [weights[0]] * len(rows(self.values[operands[0]])))
            elif word == "row":
                given = [0.0] * len(rows(self.values[operands[0]]))
                given[node["row"]] = weights[0]
                self.give(adjoint, operands[0], given)
            elif word == "mix":
                given = [0.0] * len(rows(self.values[operands[0]]))
                for weight, row in zip(weights, node["weights"]):
                    for place, share in row:
                        given[place] += weight * share
                self.give(adjoint, operands[0], given)
            elif word == "stack":
                for weight, operand in zip(weights, operands):
                    self.give(adjoint, operand, [weight])
            elif word in TWO:
                left, right = (self.values[operand] for operand in operands)
                slopes = {
                    "add": (lambda a, b: 1.0, lambda a, b: 1.0),
                    "subtract": (lambda a, b: 1.0, lambda a, b: -1.0),
                    "multiply": (lambda a, b: b, lambda a, b: a),
                    "divide": (lambda a, b: 1.0 / b, lambda a, b: -a / (b * b)),
                }[word]
                for operand, slope in zip(operands, slopes):
                    by_row = rows(pairs(slope, left, right))
                    self.give(adjoint, operand, [w * s for w, s in zip(weights, by_row)])
            else:
                if word == "power":
                    n = node["exponent"]
                    slope = lambda x, y: n * x ** (n - 1)
                else:
                    slope = ONE[word][1]
                by_row = [slope(x, y) for x, y in zip(rows(self.values[operands[0]]), rows(value))]
                self.give(adjoint, operands[0], [w * s for w, s in zip(weights, by_row)])
        for estimator, outputs in by_estimator.items():
            covariance = self.estimators[estimator]["own_covariance"]
            variance.extend(a * b * covariance[i][j] for i, a in outputs.items() for j, b in outputs.items())
        return math.sqrt(max(math.fsum(variance), 0.0))

    def give(self, adjoint, operand, weights):
        if not isinstance(self.values[operand], list) and len(weights) > 1:
            weights = [math.fsum(weights)]
        if isinstance(self.values[operand], list) and len(weights) == 1:
            weights = weights * len(self.values[operand])
        held = adjoint.get(operand)
        adjoint[operand] = weights if held is None else [a + b for a, b in zip(held, weights)]


def main(derivation_path, results_path):
    with open(derivation_path, encoding="utf-8") as file:
        graph = Graph(json.load(file))
    with open(results_path, encoding="utf-8") as file:
        results = json.load(file)["quantities"]
    ids = {node["name"]: node["id"] for node in graph.nodes if "name" in node}
    checked, worst, where, named = 0, 0.0, "", 0
    for result in results:
        named += 1
        value, u = result["value"], result["standard_uncertainty"]
        if isinstance(value, list) or value is None or u is None or isinstance(u, list):
            continue
        found = graph.uncertainty(ids[result["name"]])
        if found is None:
            continue
        checked += 1
        scale = max(u, abs(found), 1e-30)
        if abs(found - u) / scale > worst:
            worst, where = abs(found - u) / scale, result["name"]
    print(
        f"{len(graph.nodes)} nodes, {graph.recomputed} computed again, largest relative difference {graph.worst:.1e} ({graph.where}); "
        f"{named} results, {checked} uncertainties propagated again, largest relative difference {worst:.1e} ({where})"
    )
    return 0 if graph.worst <= VALUE_TOLERANCE and worst <= UNCERTAINTY_TOLERANCE else 1


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:3]))
