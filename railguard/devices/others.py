"""Names that look like an op-amp's and are none: what they are instead.

A maker's prefix says little (AD820 amplifies, AD620 is an instrumentation amplifier, AD790
compares), so these are patterns on whole order codes. Op-amps of the catalogue are looked for
first; a pattern may therefore be as wide as its number series.
"""

import re
from functools import lru_cache

from railguard.devices.model import Sort

_COMPARATORS = (
    r"(?:LM|LP|TA|NJM|BA|KA|SA|HA17|UPC|SG|NCV|AZ|AN|IR|CA|RC|MC)?[123](?:39|93)",
    r"(?:LM|NJM|NCV|BA|UPC|KA|SA|AZ)?(?:2901|2903|3302)",
    r"(?:LM|LF|LH|NJM|UPC|LP|CA|SA|TA|RC)[123](?:11|06|19|60|61|65|92)",
    r"(?:LM|KA|UA|MC1|CA|SN72|NE|MIC)?710",
    r"NE52[0679]",
    r"LMV(?:331|393|339|72\d\d|7[67]\d\d|393|761|762)",
    r"LMC(?:72\d\d|676[24]|6772)",
    r"LMP?7300",
    r"TL331|TL71[24]|TL3[01]16",
    r"TLC?(?:339|393|352|354|372|374|3702|3704|193)",
    r"TLV(?:17\d\d|18\d\d|23[59][24]|2302|2304|3[0124567]\d\d|40[1234]1|70[123]1|9022|9032)",
    r"TS(?:33[124]|37[24]|39[13]|339|370[24]|301[1-9]|302[12]|7211|7221|86[124]|88[0-9])",
    r"LT(?:101[1678]|1116|1394|1671|17(?:1[1-69]|2[01])|685|111A|1443)",
    r"LTC(?:104[02]|144[0-5]|154[0-2]|1841|1842|1998|67(?:5[24]))",
    r"AD(?:790|8561|8564|8611|8612|8468|96685|96687|CMP\d)",
    r"ADCMP\d+",
    r"CMP(?:01|02|04|401|402)",
    r"MAX(?:9\d\d|9(?:0\d\d|1[0-4]\d|20[0-3])|40(?:0[0-9]|2[5-8])|440[56]|516)",
    r"MCP65[46]\d|MCP656\dR?",
    r"MIC(?:841|842|7221|7211)",
)
_INSTRUMENTATION = (
    r"INA\d{3,4}",
    r"AD(?:52[1-9]|620|621|622|623|624|625|626|627|628|629|822[0-9]|823[0-79]|8250|8251|8253|8295)",
    r"AD(?:820[0-9]|821[0-8]|841[78]|842[0-9]|855[35]|827[01346-9])",
    r"LT(?:1101|1102|1167|1168|1789|1920|199[0156]|637[0256])",
    r"LTC(?:1100|2053|6800|610[1-6]|6115)",
    r"MAX(?:419[4-9]|4208|417[23]|437[2-8]|408[01]|9918|9920|9938|4460|4461|4462)",
    r"MCP6N\d+|MCP6C\d+",
    r"AMP0[1-5]|SSM2(?:017|019|141|142|143)|THAT15\d\d|THAT12\d\d",
    r"PGA\d+|MCP6S\d+|LTC6910|AD8555|AD526",
    r"LMP8[26]\d\d|LM8[26]0[12]",
    r"TSC1[0-9]{2}|ZXCT\d+|NCS21\d|DRV13[45]",
)
_REFERENCES = (
    r"TL43[12]|TLV?H?43[12]|TLVH?43[12]|LMV43[12]|KA431|AZ43[12]|NCP43[12]|UPC1093|NJM431|TS43[12]",
    r"LM(?:4040|4041|4050|4051|4120|4121|4125|4128|4132|4140|113|1?29|[123]29|[123]85|[123]36|399|199)",
    r"REF\d+|MAX(?:60\d\d|61\d\d|615\d|67[1-8]|872|874|87[356])|ADR\d+|LT(?:1004|1009|1019|1021|1027|"
    r"1029|1031|1034|1236|1389|1460|1461|1634|1790|6650|6654|6656|6660)",
    r"ISL(?:21\d+|6000\d)|MCP15\d\d|AD(?:58[0-9]|780|1580|158[2-5])|ICL8069|LTZ1000|LTC6655|TLE2425|TLE2426",
)
_TIMERS = (
    r"(?:NE|SE|SA|LM|TLC|ICM|LMC|CA|MC1|KA|NJM|TS|UA|GLC|XR|SG|HA17)?7?55[56]",
    r"XR2240|LTC699[0-5]|TPL5\d+|MC1455|NA555",
)
_REGULATORS = (
    r"(?:LM|UA|MC|L|KA|NJM|BA|TA|UPC|AN|TS|NCP|NCV)?(?:78|79)[LMS]?\d\d(?!\d)",
    r"(?:LM|UA|MC|LP|SA|UC|TL)[123](?:17|23|33|37|38|40|50)(?:[A-Z]|$|[-_/ ])",
    r"LM(?:1084|1085|1086|1117|2575|2576|2577|2596|2675|2931|2936|2937|2940|2941|2990|723|5\d{3})",
    r"(?:UA|LM|MC1|L)723|MC34063A?|L20[0]|L49\d\d|L5973",
    r"LD1117|AMS1117|REG1117|TLV1117|NCP1117|LP29(?:5[01]|8[0-9])|LP5907|LP3\d{3}|MIC52\d\d|MCP17\d\d|"
    r"TPS\d+|ADP\d+|LT(?:1083|1084|1085|1086|1117|1129|176[1-5]|196[1-5]|30\d\d|80\d\d|86\d\d)|"
    r"LTC(?:3\d{3}|1044|660)|ICL76(?:60|62)|MAX(?:660|1044|63\d|77\d)|TL497|TL494|SG3525A?|UC38\d\d|"
    r"XC6206|HT73\d\d|AP2112|RT9\d{3}|ME6211",
)
_OTHERS = (
    r"BUF\d+|LH00[03]\d|EL2001|LT1010|AD8271|HA5033|MAX405",
    r"LM(?:1?3700|13600|3080)|CA3080|NE5517|OPA(?:615|660|860|861)|MAX43[56]",
    r"LM(?:38[0-9]|39[01]|3886|3875|3876|2876|2877|2878|4[78]\d\d)|TDA(?:7\d{3}|1514|8\d{3}|1013|1517|"
    r"1554|2003|2822|2005)|TBA8[012]0|MAX98[13]\d|TPA\d+|PAM8\d{3}|NJM386|TEA2025",
    r"THS45\d\d|THS41[2-6]\d|ADA49[234]\d|ADA4950|ADL\d+|LMH65\d\d|AD81(?:3[1-9]|32)|LTC6[46]\d\d|"
    r"LTC199[24]|OPA1632|LME49724|MAX4(?:147|198)",
    r"AD(?:63[0-9]|53[0-9]|73[456]|83[045]|830[0-9]|831[0-9]|836[0-9]|55[0-9]{2}|56[0-9]{2}|57\d\d|7[0-9]{3})|"
    r"MPY634|MC149[456]|LOG10\d|XTR1\d\d|RCV420|VCA\d+|ISO1\d\d|AD202|LTC1043|"
    r"LF398|LF198|SHC\d+|SMP04|AD585|AD783|DG4\d\d|ADG\d+|MAX4[567]\d\d|CD40\d\d|CD45\d\d|"
    r"74[A-Z]*\d+|HEF4\d{3}|TS5A\d+|MCP3\d{3}|MCP4\d{3}|ADS\d+|DAC\d+|MAX232|LM3[45](?!\d)|LM13[45]|"
    r"LM234|LM334|TMP\d+|ULN\d+|L29[38]D?|LM3909|LM39(?:14|15|16)|LM566|LM565|LM567|NE56[0-9]|"
    r"LM2907|LM2917|LM331|VFC\d+|AD65[0-4]|LM12H?458|PC817|4N\d\d|6N13\d|CNY\d+|TLP\d+|MOC\d+|"
    r"REF20\d|LM3046|CA3046|MAT0\d|SSM2212|LM394|LMH6\d{3}SW|MC1648|MAX038|XR2206|ICL8038|AD9[1-9]\d\d|LM[239]900|LM359|MC3[34]01|CA3094",
)

TABLE: tuple[tuple[Sort, tuple[str, ...]], ...] = (
    ("comparator", _COMPARATORS),
    ("instrumentation", _INSTRUMENTATION),
    ("reference", _REFERENCES),
    ("timer", _TIMERS),
    ("regulator", _REGULATORS),
    ("other", _OTHERS),
)


def sort_of(code: str) -> Sort | None:
    """Return what an upper-case order code is, where it is no op-amp; None: not known."""
    for sort, pattern in _compiled():
        if pattern.match(code):
            return sort
    return None


@lru_cache(maxsize=1)
def _compiled() -> tuple[tuple[Sort, re.Pattern[str]], ...]:
    # Compiled at first use: a netlist whose amplifiers are all in the catalogue never needs it.
    return tuple(
        (sort, re.compile(f"(?:{'|'.join(patterns)})(?![0-9])")) for sort, patterns in TABLE
    )
