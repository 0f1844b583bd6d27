"""Devices that share prefixes, numbers or packages with op-amps are not taken for op-amps.

What each is comes from its maker's data-sheet title, from memory. TS331, TS861, TS864, LT1011,
LT1017, LTC1443 were also read as comparators in STMicroelectronics and Linear Technology sheets.
"""

import pytest

from railguard.devices.catalogue import load

OTHERS = {
    "comparator": (
        "LM393N LM393DR LM339N LM339DR2G LM2903DR LM2901N LM311P LM311N LM319N LMV331IDBVR "
        "LMV7219M5 TLC372CP TLC374CN TLC3702CP TLV3501AIDBVR TS331ICT TS861ILT TS864IDT "
        "LT1011CN8 LT1016CN8 LT1017CN8 LT1719CS8 LTC1443CS AD790JN AD8561ARZ ADCMP600BRJZ "
        "MAX931CPA MAX9021AXK MCP6541-I/SN MCP6562-E/SN"
    ),
    "instrumentation": (
        "INA128PA INA2128UA INA333AIDGKR AD620ANZ AD623ARZ AD627ARZ AD8221ARZ AD8226ARZ AD8429ARZ "
        "LT1167CN8 LT1920CS8 MAX4194ESA AMP04FPZ INA180A1IDBVR LTC6102HVCMS8"
    ),
    "reference": "TL431ACLP TLV431BQDBZT LM4040DIZ-2.5 REF3025AIDBZT LM336Z-2.5 LT1019CN8-5",
    "timer": "NE555P LM555CN TLC555CP ICM7555IPAZ NE556N SA555D",
    "regulator": (
        "LM317T LM7805CT L7805CV LM337T LM2940CT-5.0 TPS7A4901DGNR LP2950ACZ-5.0 LM2596S-ADJ"
    ),
    "other": (
        "OPA860IDR LM13700N BUF634P LM386N-1 TDA7294V THS4521IDR AD8138ARZ LF398N LM35DZ CD4066BE "
        "ADG419BRZ LM3916N PC817 AD633JNZ LM3046"
    ),
}


@pytest.mark.parametrize(
    ("code", "sort"), [(code, sort) for sort, codes in OTHERS.items() for code in codes.split()]
)
def test_another_device_is_recognised_and_not_judged_as_an_op_amp(code, sort):
    """It has no figures, and the sort says what it is."""
    match = load().match(code)
    assert (match.sort, match.device) == (sort, None)


def test_there_are_sixty_of_them():
    """Each counts once."""
    assert len({code for codes in OTHERS.values() for code in codes.split()}) >= 60
