"""From the nested lists of one EDIF entry to what it declares."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from types import MappingProxyType

from reactance.analysis.design import Direction
from reactance.analysis.exports import edif_entries as says
from reactance.analysis.exports.edif_forms import Sexp
from reactance.analysis.exports.edif_names import BadEntryError, Name, found, keyword, name, reference, string
from reactance.analysis.exports.edif_values import Attribute, attributes, scales


def declaration(form: list[Sexp]) -> object:
    """What an entry declares; `Bad` with the reason where it cannot be understood."""
    try:
        return _BUILDERS[keyword(form)](form)
    except BadEntryError as error:
        shown = form[1][:60] if len(form) > 1 and isinstance(form[1], str) else ""
        return says.Bad(f"({form[0]} {shown}{' ' if shown else ''}…): {error}")


def _instance(form: list[Sexp]) -> says.Instance:
    declared = name(_item(form))
    cells: tuple[says.CellRef, ...] = ()
    designator = ""
    texts: list[Attribute] = []
    numbers: list[says.PinNumber] = []
    faults: list[str] = []
    for item in form[2:]:
        kind = keyword(item)
        try:
            if kind in ("property", "parameterassign"):
                texts.extend(attributes(item))
            elif kind == "viewref":
                cells = (_view_ref(item),)
            elif kind == "viewlist":
                cells = tuple(_view_list(item))
            elif kind == "designator":
                designator = designator or _designator(item)
            elif kind == "portinstance":
                numbers.extend(_port_instance(item))
        except BadEntryError as error:
            faults.append(f"instance {declared.text}: {error}")
    if not cells:
        raise BadEntryError("an instance without (viewRef … (cellRef …)) has no cell")
    plain: Mapping[str, str] | None = None
    if not any(attribute.unit for attribute in texts):
        plain = MappingProxyType(dict({each.key: (each.name, each.text) for each in texts}.values()))
    longest = max(
        len(declared.text), len(designator), *(max(len(each.name), len(each.text)) for each in texts), 0
    )
    stands = bool(designator) and not designator.endswith("?")
    usual = stands and plain is not None and not (declared.size or numbers or faults)
    return says.Instance(
        declared, cells, designator, tuple(texts), tuple(numbers), tuple(faults), plain, longest, usual
    )


def _item(form: Sexp, position: int = 1) -> Sexp | None:
    return form[position] if len(form) > position else None


def _view_ref(form: Sexp) -> says.CellRef:
    view, _ = reference(_item(form))
    return _cell_ref(_item(form, 2), view)


def _cell_ref(form: Sexp | None, view: str = "") -> says.CellRef:
    if form is None or keyword(form) != "cellref":
        raise BadEntryError("expected (cellRef …)")
    cell, _ = reference(_item(form))
    inner = _item(form, 2)
    library = ""
    if inner is not None and keyword(inner) == "libraryref":
        library, _ = reference(_item(inner))
    return says.CellRef(view, cell, library)


def _view_list(form: Sexp) -> list[says.CellRef]:
    cells: list[says.CellRef] = []
    for item in form[1:]:
        if keyword(item) == "viewlist":
            cells.extend(_view_list(item))
        elif keyword(item) == "viewref":
            cells.append(_view_ref(item))
    return cells


def _designator(form: Sexp) -> str:
    inner = _item(form)
    return string(inner).strip() if inner is not None else ""


def _port_instance(form: Sexp) -> list[says.PinNumber]:
    port, index = reference(_item(form))
    numbers = []
    for item in form[2:]:
        if keyword(item) == "designator":
            numbers.append(says.PinNumber(says.PortRef((port,), index), _designator(item)))
        elif keyword(item) == "portinstance":
            inner = _port_instance(item)
            numbers.extend(
                says.PinNumber(ref._replace(port=(port, *ref.port)), number) for ref, number in inner
            )
    return numbers


def _port_ref(form: Sexp) -> says.PortRef:
    port, index = reference(_item(form))
    outer = _item(form, 2)
    if outer is None:
        return says.PortRef((port,), index)
    kind = keyword(outer)
    if kind == "instanceref":
        if len(outer) == 2 and isinstance(outer[1], str):
            return says.PortRef((port,), index, (outer[1],))
        path, instance_index = _instance_ref(outer)
        return says.PortRef((port,), index, path, instance_index)
    if kind == "portref":
        bundle = _port_ref(outer)
        return bundle._replace(port=(*bundle.port, port), member=bundle.member + index)
    if kind == "viewref":
        return says.PortRef((port,), index)
    raise BadEntryError(f"expected (instanceRef …) in (portRef {port} …){found(outer)}")


def _instance_ref(form: Sexp) -> tuple[tuple[str, ...], tuple[int, ...]]:
    """Path, innermost last, and the index of the innermost."""
    instance, index = reference(_item(form))
    outer = _item(form, 2)
    if outer is not None and keyword(outer) == "instanceref":
        path, _ = _instance_ref(outer)
        return (*path, instance), index
    return (instance,), index


def _refs(form: Sexp, faults: list[str]) -> list[says.Ref]:
    refs: list[says.Ref] = []
    for item in form[1:]:
        kind = keyword(item)
        try:
            if kind == "portref":
                refs.append(_port_ref(item))
            elif kind == "portlist":
                refs.append(says.PortList(tuple(_refs(item, faults))))
            elif kind == "globalportref":
                refs.append(says.GlobalRef(reference(_item(item))[0]))
            elif kind:
                faults.append(f"({kind} …) has no meaning in ({keyword(form)} …); passed over")
        except BadEntryError as error:
            faults.append(str(error))
    return refs


def _net(form: Sexp) -> says.Net:
    declared = name(_item(form))
    refs: list[says.Ref] = []
    inner: list[says.Net] = []
    instances: list[says.Instance] = []
    faults: list[str] = []
    for item in form[2:]:
        kind = keyword(item)
        try:
            if kind == "joined":
                refs.extend(_refs(item, faults))
            elif kind == "net":
                inner.append(_net(item))
            elif kind == "instance" and isinstance(item, list):
                instances.append(_instance(item))
        except BadEntryError as error:
            faults.append(str(error))
    said = tuple(f"net {declared.text}: {fault}" for fault in faults)
    plain = None if inner or instances or faults or declared.size else _plain(refs)
    return says.Net(declared, tuple(refs), tuple(inner), tuple(instances), said, plain)


def _plain(refs: list[says.Ref]) -> tuple[tuple[str, str], ...] | None:
    pairs: list[tuple[str, str]] = []
    for ref in refs:
        if not isinstance(ref, says.PortRef) or ref.member or ref.instance_index:
            return None
        if len(ref.port) != 1 or len(ref.instance) > 1:
            return None
        pairs.append((ref.port[0].lower(), ref.instance[0].lower() if ref.instance else ""))
    return tuple(pairs)


def _net_bundle(form: list[Sexp]) -> says.NetBundle:
    declared = name(_item(form))
    nets: list[says.Net] = []
    faults: list[str] = []
    for listing in form[2:]:
        if keyword(listing) != "listofnets":
            continue
        for item in listing[1:]:
            try:
                if keyword(item) == "net":
                    nets.append(_net(item))
            except BadEntryError as error:
                faults.append(f"net bundle {declared.text}: {error}")
    return says.NetBundle(declared, tuple(nets), tuple(faults))


_DIRECTIONS: Mapping[str, Direction] = MappingProxyType(
    {"input": "input", "output": "output", "inout": "inout"}
)


def _port(form: Sexp) -> says.Port:
    declared = name(_item(form))
    direction: Direction = ""
    number = ""
    for item in form[2:]:
        kind = keyword(item)
        if kind == "direction" and len(item) > 1 and isinstance(item[1], str):
            direction = _DIRECTIONS.get(item[1].lower(), "")
        elif kind == "designator":
            number = _designator(item)
    return says.Port(declared, direction, number)


def _port_bundle(form: Sexp) -> says.Port:
    declared = name(_item(form))
    inner: list[says.Port] = []
    for listing in form[2:]:
        if keyword(listing) != "listofports":
            continue
        for item in listing[1:]:
            kind = keyword(item)
            if kind == "port":
                inner.append(_port(item))
            elif kind == "portbundle":
                inner.append(_port_bundle(item))
    return says.Port(declared, "", "", tuple(inner), True)


def _view_map(form: list[Sexp]) -> says.ViewMap:
    annotations: list[says.Annotation] = []
    faults: list[str] = []
    for item in form[1:]:
        try:
            if keyword(item) == "instancebackannotate":
                annotations.append(_instance_annotation(item))
            elif keyword(item) == "portbackannotate":
                annotations.append(_port_annotation(item))
        except BadEntryError as error:
            faults.append(f"back-annotation: {error}")
    return says.ViewMap(tuple(annotations), tuple(faults))


def _instance_annotation(form: Sexp) -> says.Annotation:
    target = _item(form)
    if target is None or keyword(target) != "instanceref":
        raise BadEntryError("expected (instanceRef …)")
    path, _ = _instance_ref(target)
    designator = ""
    texts: list[Attribute] = []
    for item in form[2:]:
        if keyword(item) == "designator":
            designator = _designator(item)
        elif keyword(item) == "property":
            texts.extend(attributes(item))
    return says.Annotation(path, designator, tuple(texts), ())


def _port_annotation(form: Sexp) -> says.Annotation:
    target = _item(form)
    if target is None or keyword(target) != "portref":
        raise BadEntryError("expected (portRef …)")
    ref = _port_ref(target)
    numbers = [_designator(item) for item in form[2:] if keyword(item) == "designator"]
    port = ref._replace(instance=(), instance_index=())
    return says.Annotation(
        ref.instance, "", (), tuple(says.PinNumber(port, number) for number in numbers if number)
    )


def _word(form: list[Sexp]) -> says.Word:
    return says.Word(name(_item(form)))


def _design(form: list[Sexp]) -> says.DesignRef:
    for item in form[2:]:
        if keyword(item) == "cellref":
            return says.DesignRef(name(_item(form)), _cell_ref(item))
    raise BadEntryError("a design without (cellRef …) names no top cell")


_BUILDERS: Mapping[str, Callable[[list[Sexp]], object]] = MappingProxyType(
    {
        "instance": _instance,
        "net": _net,
        "netbundle": _net_bundle,
        "offpageconnector": lambda form: says.OffPage(name(_item(form))),
        "port": _port,
        "portbundle": _port_bundle,
        "joined": lambda form: says.Joined(tuple(_refs(form, []))),
        "property": lambda form: says.Properties(tuple(attributes(form))),
        "parameter": lambda form: says.Properties(tuple(attributes(form))),
        "viewmap": _view_map,
        "technology": lambda form: says.Technology(scales(form)),
        "design": _design,
        "rename": lambda form: says.Word(name(form)),
        "name": lambda form: says.Word(name(form)),
        "celltype": _word,
        "viewtype": _word,
        "designator": lambda form: says.Word(Name("", _designator(form))),
        "edifversion": lambda form: says.Version(tuple(item for item in form[1:] if isinstance(item, str))),
        "keywordmap": lambda form: says.Word(Name("", "")),
    }
)
