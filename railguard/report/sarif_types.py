"""The part of SARIF 2.1.0 (OASIS, errata 01) that a report uses, as wire types.

Names are the standard's, in camel case on the wire; what is not set is left out.
"""

from typing import Literal

import msgspec

SCHEMA = (
    "https://docs.oasis-open.org/sarif/sarif/v2.1.0/errata01/os/schemas/sarif-schema-2.1.0.json"
)
VERSION = "2.1.0"

Level = Literal["none", "note", "warning", "error"]


class _Wire(msgspec.Struct, frozen=True, kw_only=True, rename="camel", omit_defaults=True):
    """What all have in common: camel case, defaults left out."""


class Message(_Wire, frozen=True, kw_only=True):
    """A message object, 3.11: plain text."""

    text: str


class ArtifactLocation(_Wire, frozen=True, kw_only=True):
    """Where a file is, 3.4: relative to a base that `originalUriBaseIds` names, or absolute."""

    uri: str | None = None
    uri_base_id: str | None = None
    index: int = -1
    description: Message | None = None


class Region(_Wire, frozen=True, kw_only=True):
    """A place in a file, 3.30; columns begin at 1, the end column stands behind the last one."""

    start_line: int
    start_column: int | None = None
    end_column: int | None = None


class PhysicalLocation(_Wire, frozen=True, kw_only=True):
    """A file and a place in it, 3.29."""

    artifact_location: ArtifactLocation
    region: Region | None = None


class LogicalLocation(_Wire, frozen=True, kw_only=True):
    """An element or a net of the circuit, 3.33."""

    name: str
    fully_qualified_name: str
    kind: str


class Place(_Wire, frozen=True, kw_only=True):
    """A location object, 3.28."""

    id: int = -1
    physical_location: PhysicalLocation | None = None
    logical_locations: tuple[LogicalLocation, ...] = ()
    message: Message | None = None


class DescriptorReference(_Wire, frozen=True, kw_only=True):
    """Which rule or which kind of notification, 3.52."""

    id: str
    index: int


class Notification(_Wire, frozen=True, kw_only=True):
    """What the run itself has to say, 3.58."""

    descriptor: DescriptorReference
    level: Level
    message: Message
    locations: tuple[Place, ...] = ()
    associated_rule: DescriptorReference | None = None


class Invocation(_Wire, frozen=True, kw_only=True):
    """One call of the program, 3.20."""

    execution_successful: bool
    tool_execution_notifications: tuple[Notification, ...] = ()


class Suppression(_Wire, frozen=True, kw_only=True):
    """A waiver, 3.35."""

    kind: Literal["inSource", "external"]
    status: Literal["accepted"]
    justification: str
    location: Place | None = None
    properties: dict[str, object] = {}


class Content(_Wire, frozen=True, kw_only=True):
    """Text of a file, 3.3; unlike a message's it is taken as it is."""

    text: str


class Replacement(_Wire, frozen=True, kw_only=True):
    """A region and what stands there instead, 3.57."""

    deleted_region: Region
    inserted_content: Content


class ArtifactChange(_Wire, frozen=True, kw_only=True):
    """The replacements in one file, 3.56."""

    artifact_location: ArtifactLocation
    replacements: tuple[Replacement, ...]


class Fix(_Wire, frozen=True, kw_only=True):
    """A proposed change, 3.55."""

    description: Message
    artifact_changes: tuple[ArtifactChange, ...]


class Result(_Wire, frozen=True, kw_only=True):
    """One finding, 3.27."""

    rule_id: str
    rule_index: int
    level: Level
    message: Message
    locations: tuple[Place, ...] = ()
    related_locations: tuple[Place, ...] = ()
    partial_fingerprints: dict[str, str]
    suppressions: tuple[Suppression, ...] = ()
    fixes: tuple[Fix, ...] = ()
    properties: dict[str, object] = {}


class Descriptor(_Wire, frozen=True, kw_only=True):
    """A rule or a kind of notification, 3.49."""

    id: str
    short_description: Message
    full_description: Message | None = None
    help: Message | None = None
    properties: dict[str, object] = {}


class Component(_Wire, frozen=True, kw_only=True):
    """The program and its rules, 3.19."""

    name: str
    semantic_version: str
    short_description: Message
    rules: tuple[Descriptor, ...]
    notifications: tuple[Descriptor, ...]


class Tool(_Wire, frozen=True, kw_only=True):
    """A tool object, 3.18."""

    driver: Component


class Artifact(_Wire, frozen=True, kw_only=True):
    """A file that was read, 3.24."""

    location: ArtifactLocation
    roles: tuple[str, ...] = ()


class Run(_Wire, frozen=True, kw_only=True):
    """One run, 3.14; `results` stands even where there are none: the run did look."""

    tool: Tool
    invocations: tuple[Invocation, ...]
    original_uri_base_ids: dict[str, ArtifactLocation]
    artifacts: tuple[Artifact, ...]
    column_kind: Literal["unicodeCodePoints"]
    newline_sequences: tuple[str, ...]
    results: tuple[Result, ...]
    properties: dict[str, object]


class Log(_Wire, frozen=True, kw_only=True):
    """A SARIF file, 3.13."""

    version: str
    schema: str = msgspec.field(name="$schema")
    runs: tuple[Run, ...]
