"""Whether Excel lets macros run, which is kept in the registry by the user or by an organisation's policy.

Excel runs the macros of files in trusted locations, of which its startup folder is one, whatever else is set: unless
trusted locations, add-ins or VBA itself are switched off.
"""

from __future__ import annotations

from beamfuncs.hosts.excel_addin import windows
from beamfuncs.hosts.excel_addin.findings import Finding

SECURITY, LOCATIONS, COMMON = r"Excel\Security", r"Excel\Security\Trusted Locations", "Common"
TRUST_CENTER = "File > Options > Trust Center > Trust Center Settings"
WARNINGS = {
    1: "all macros run",
    2: "Excel asks before it runs macros",
    3: "macros without a trusted signature are blocked",
    4: "macros are blocked",
}
"""`VBAWarnings`, as Microsoft documents its values."""
_ASKED = 2


def findings() -> list[Finding]:
    """Return whether macros run, or each thing that keeps the add-in from working."""
    blocked = [
        _blocked(COMMON, "VBAOff", "VBA is switched off for all of Office", "to switch VBA on"),
        _blocked(SECURITY, "DisableAllAddins", "add-ins are switched off", f"{TRUST_CENTER} > Add-ins"),
        _blocked(SECURITY, "RequireAddinSig", "add-ins without a signature are blocked", f"{TRUST_CENTER} > Add-ins"),
        _locations(),
    ]
    return [one for one in blocked if one] or [Finding("macros", f"{_warnings()}; the startup folder is trusted")]


def _setting(part: str, name: str) -> tuple[str | int | None, bool]:
    """Return a setting of Office, and whether it comes from a policy, which goes before what the user chose."""
    office = windows.office()
    policy, own = rf"Software\Policies\Microsoft\Office\{office}\{part}", rf"Software\Microsoft\Office\{office}\{part}"
    for root, key in (
        (windows.USER, policy),
        (windows.MACHINE, policy),
        (windows.USER, own),
        (windows.MACHINE, own),
    ):
        found = windows.registry(root, key, name)
        if found is not None:
            return found, key == policy
    return None, False


def _blocked(part: str, name: str, told: str, remedy: str) -> Finding | None:
    value, policy = _setting(part, name)
    if value != 1:
        return None
    return Finding("macros", f"{told} ({name}; #NAME? in every cell)", _who(policy, remedy))


def _locations() -> Finding | None:
    found = _blocked(
        LOCATIONS, "AllLocationsDisabled", "trusted locations are off", f"{TRUST_CENTER} > Trusted Locations"
    )
    if found is None or _warnings() == WARNINGS[1]:
        return None
    return Finding("macros", f"{found.told}, and {_warnings()}", found.mend)


def _warnings() -> str:
    value, _ = _setting(SECURITY, "VBAWarnings")
    return WARNINGS.get(value if isinstance(value, int) else _ASKED, WARNINGS[_ASKED])


def _who(policy: bool, remedy: str) -> str:
    if policy:
        return f"a policy of your organisation says so: ask its administrator ({remedy})"
    return f"change it under {remedy}" if ">" in remedy else f"ask the administrator {remedy}"
