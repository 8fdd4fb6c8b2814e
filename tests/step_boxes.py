"""STEP files of boxes, written out entity by entity (ISO 10303-21, AP 214)."""

from __future__ import annotations

import numpy as np
from made_bodies import CUBE_QUADS
from two_boxes import box

HEADER = (
    "ISO-10303-21;\nHEADER;\nFILE_DESCRIPTION((''),'2;1');\n"
    "FILE_NAME('','',(''),(''),'','','');\nFILE_SCHEMA(('AUTOMOTIVE_DESIGN'));\nENDSEC;\nDATA;\n"
)
MILLIMETRE = "(LENGTH_UNIT()NAMED_UNIT(*)SI_UNIT(.MILLI.,.METRE.))"
NORMALS = [(0, 0, -1), (0, 0, 1), (0, -1, 0), (0, 1, 0), (-1, 0, 0), (1, 0, 0)]


class StepWriter:
    """Entities of a STEP file, numbered as they come."""

    def __init__(self, unit: str = MILLIMETRE, inch: str | None = None) -> None:
        self._lines: list[str] = []
        length = self.add(unit) if inch is None else self._inch(inch)
        angle = self.add("(NAMED_UNIT(*)PLANE_ANGLE_UNIT()SI_UNIT($,.RADIAN.))")
        solid = self.add("(NAMED_UNIT(*)SI_UNIT($,.STERADIAN.)SOLID_ANGLE_UNIT())")
        close = self.add(
            f"UNCERTAINTY_MEASURE_WITH_UNIT(LENGTH_MEASURE(1.E-07),{length},'close','')"
        )
        self._context = self.add(
            f"(GEOMETRIC_REPRESENTATION_CONTEXT(3)GLOBAL_UNCERTAINTY_ASSIGNED_CONTEXT(({close}))"
            f"GLOBAL_UNIT_ASSIGNED_CONTEXT(({length},{angle},{solid}))"
            "REPRESENTATION_CONTEXT('',''))"
        )
        use = self.add("APPLICATION_CONTEXT('automotive design')")
        self.add(f"APPLICATION_PROTOCOL_DEFINITION('','automotive_design',2000,{use})")
        self._product = self.add(f"PRODUCT_CONTEXT('',{use},'mechanical')")
        self._design = self.add(f"PRODUCT_DEFINITION_CONTEXT('part definition',{use},'design')")

    def add(self, text: str) -> str:
        """Add an entity; returns its number."""
        self._lines.append(text)
        return f"#{len(self._lines)}"

    def text(self) -> str:
        """The whole file."""
        rows = "".join(f"#{k}={line};\n" for k, line in enumerate(self._lines, 1))
        return f"{HEADER}{rows}ENDSEC;\nEND-ISO-10303-21;\n"

    def part(self, name: str, item: str) -> tuple[str, str, str]:
        """Add a product of one solid or surface."""
        kind = "ADVANCED_BREP_SHAPE_REPRESENTATION"
        if "SHELL_BASED" in self._lines[int(item[1:]) - 1]:
            kind = "MANIFOLD_SURFACE_SHAPE_REPRESENTATION"
        return self._shape(name, [item], kind)

    def bodies(self, name: str, items: list[str]) -> None:
        """Add a product of several solids."""
        self._shape(name, items, "ADVANCED_BREP_SHAPE_REPRESENTATION")

    def solid(self, corners: np.ndarray, name: str = "") -> str:
        """Add a box with corners numbered x + 2 y + 4 z."""
        shell = self.add(f"CLOSED_SHELL('',({self._faces(corners, 6)}))")
        return self.add(f"MANIFOLD_SOLID_BREP('{name}',{shell})")

    def sheet(self, corners: np.ndarray, faces: int) -> str:
        """Add an open surface of the first few faces of a box."""
        shell = self.add(f"OPEN_SHELL('',({self._faces(corners, faces)}))")
        return self.add(f"SHELL_BASED_SURFACE_MODEL('',({shell}))")

    def assembly(self, name: str, parts: list[tuple[str, str, str]], shifts) -> None:
        """Add a product that holds others, each shifted."""
        places = [self._axes(shift) for shift in shifts]
        whole, shape, _ = self._shape(name, places, "SHAPE_REPRESENTATION")
        for (part, inner, axes), place in zip(parts, places, strict=True):
            use = self.add(f"NEXT_ASSEMBLY_USAGE_OCCURRENCE('{part}','','',{whole},{part},$)")
            defined = self.add(f"PRODUCT_DEFINITION_SHAPE('','',{use})")
            moved = self.add(f"ITEM_DEFINED_TRANSFORMATION('','',{axes},{place})")
            link = self.add(
                f"(REPRESENTATION_RELATIONSHIP('','',{inner},{shape})"
                f"REPRESENTATION_RELATIONSHIP_WITH_TRANSFORMATION({moved})"
                "SHAPE_REPRESENTATION_RELATIONSHIP())"
            )
            self.add(f"CONTEXT_DEPENDENT_SHAPE_REPRESENTATION({link},{defined})")

    def _inch(self, name: str) -> str:
        base = self.add(MILLIMETRE)
        measure = self.add(f"LENGTH_MEASURE_WITH_UNIT(LENGTH_MEASURE(25.4),{base})")
        powers = self.add("DIMENSIONAL_EXPONENTS(1.,0.,0.,0.,0.,0.,0.)")
        return self.add(
            f"(CONVERSION_BASED_UNIT('{name}',{measure})LENGTH_UNIT()NAMED_UNIT({powers}))"
        )

    def _shape(self, name: str, items: list[str], kind: str) -> tuple[str, str, str]:
        product = self.add(f"PRODUCT('{name}','{name}','',({self._product}))")
        self.add(f"PRODUCT_RELATED_PRODUCT_CATEGORY('part',$,({product}))")
        form = self.add(f"PRODUCT_DEFINITION_FORMATION('','',{product})")
        definition = self.add(f"PRODUCT_DEFINITION('design','',{form},{self._design})")
        shape = self.add(f"PRODUCT_DEFINITION_SHAPE('','',{definition})")
        axes = self._axes((0, 0, 0))
        found = self.add(f"{kind}('',({','.join([axes, *items])}),{self._context})")
        self.add(f"SHAPE_DEFINITION_REPRESENTATION({shape},{found})")
        return definition, found, axes

    def _triple(self, kind: str, numbers) -> str:
        return self.add(f"{kind}('',({','.join(repr(float(x)) for x in numbers)}))")

    def _axes(self, place, normal=(0, 0, 1)) -> str:
        across = (0, 1, 0) if normal[0] else (1, 0, 0)
        point = self._triple("CARTESIAN_POINT", place)
        axis, first = self._triple("DIRECTION", normal), self._triple("DIRECTION", across)
        return self.add(f"AXIS2_PLACEMENT_3D('',{point},{axis},{first})")

    def _faces(self, corners: np.ndarray, number: int) -> str:
        points = [self._triple("CARTESIAN_POINT", corner) for corner in corners]
        vertices = [self.add(f"VERTEX_POINT('',{point})") for point in points]
        edges: dict[tuple[int, int], str] = {}
        faces = []
        for quad, normal in list(zip(CUBE_QUADS.tolist(), NORMALS, strict=True))[:number]:
            sides = []
            for a, b in zip(quad, [*quad[1:], quad[0]], strict=True):
                low, high = min(a, b), max(a, b)
                if (low, high) not in edges:
                    d = self._triple("DIRECTION", np.sign(corners[high] - corners[low]))
                    vector = self.add(f"VECTOR('',{d},1.)")
                    line = self.add(f"LINE('',{points[low]},{vector})")
                    edges[low, high] = self.add(
                        f"EDGE_CURVE('',{vertices[low]},{vertices[high]},{line},.T.)"
                    )
                way = "T" if a < b else "F"
                sides.append(self.add(f"ORIENTED_EDGE('',*,*,{edges[low, high]},.{way}.)"))
            loop = self.add(f"EDGE_LOOP('',({','.join(sides)}))")
            bound = self.add(f"FACE_OUTER_BOUND('',{loop},.T.)")
            plane = self.add(f"PLANE('',{self._axes(corners[quad[0]], normal)})")
            faces.append(self.add(f"ADVANCED_FACE('',({bound}),{plane},.T.)"))
        return ",".join(faces)


def two_in_an_assembly(names=("rod", "can"), **unit: str) -> str:
    """The two boxes of ``two_boxes`` in an assembly that shifts the can."""
    writer = StepWriter(**unit)
    rod = writer.part(names[0], writer.solid(box((0, 0, 0), (1, 1, 1))))
    can = writer.part(names[1], writer.solid(box((0, 0, 0), (1, 2, 1))))
    writer.assembly("pair", [rod, can], [(0, 0, 0), (3, 0, 0)])
    return writer.text()
