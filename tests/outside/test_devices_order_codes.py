"""Order codes as makers' ordering tables list them lead to the right family and channel count.

`READ` were read in the documents named; `REMEMBERED` are from memory of the makers' ordering
tables and catalogues.
"""

import pytest

from railguard.devices.catalogue import load

READ = {
    # STMicroelectronics TS914, Rev 5 (January 2007), order codes
    ("TS912", 4): "TS914IN TS914ID TS914IDT TS914AIN TS914AID TS914AIDT TS914IYD TS914AIYDT",
    # STMicroelectronics LM833, Rev 2 (July 2005), and National LM833, connection diagram
    ("LM833", 2): "LM833N LM833D LM833DT LM833YD LM833YDT LM833M LM833MX LM833AM LM833AMX LM833MM",
    # Texas Instruments MC1458/MC1558, SLOS069C, ordering information
    ("MC1458", 2): "MC1458P MC1458D MC1458DR MC1458PSR MC1558JG MC1558JGB MC1558FK",
    # Texas Instruments LF351, SLOS014B, available options
    ("LF353", 1): "LF351D LF351P LF351DR",
    # National LF353, DS005649, order numbers
    ("LF353", 2): "LF353M LF353MX LF353N",
    # STMicroelectronics LMV321/LMV358 DS4539 Rev 9; Texas Instruments SLOS415 package drawings
    ("LMV358", 1): "LMV321ILT LMV321RILT",
    ("LMV358", 2): "LMV358IDT LMV358IPT",
    # Diodes Incorporated TL072, Rev 1, ordering information
    ("TL07x", 2): "TL072SG-13",
    # Analog Devices AD822, package options as sold (AD822ANZ, AD822BRZ, AD822ARM-R2)
    ("AD822", 2): "AD822ANZ AD822BRZ AD822ARM-R2 AD822AR-3V",
    # Analog Devices OP1177/OP2177/OP4177, Rev B
    ("OP1177", 1): "OP1177AR",
    ("OP1177", 2): "OP2177ARM OP2177AR",
    ("OP1177", 4): "OP4177AR OP4177ARM",
    # National LMC6482, DS011713
    ("LMC6482", 2): "LMC6482IN LMC6482IMX LMC6482IMMX LMC6482AIN LMC6482AIMX LMC6482IMMX/NOPB",
    # Texas Instruments TLC227x, SLOS190
    ("TLC227x", 2): "TLC2272QD TLC2272QDR TLC2272MUB TLC2272MP TLC2272MJGB TLC2272CPWR TLC2272AIDR",
    ("TLC227x", 4): "TLC2274CNSLE",
    # Microchip DS21733, DS21669, DS21314 product identification
    ("MCP6001", 2): "MCP6002-I/SN MCP6002-I/SNG",
    ("MCP604x", 2): "MCP6042-E/SN",
    ("MCP601", 4): "MCP604-I/SL",
    # Texas Instruments OPA197 SBOS737, OPA345 SBOS107, TL084 SLOS081, LT1013 SLOS018
    ("OPA197", 1): "OPA197IDBVR OPA197IDR",
    ("OPA345", 1): "OPA345UA/2K5",
    ("TL08x", 4): "TL084CD",
    ("LT1013", 2): "LT1013AFK",
}

REMEMBERED = {
    ("TL07x", 1): "TL071CP TL071CDR TL071ACP TL071BCD TL071IDR",
    ("TL07x", 2): "TL072CP TL072CDR TL072ACP TL072BCP TL072IDR TL072CPWR TL072CN",
    ("TL07x", 4): "TL074CN TL074CDR TL074ACN TL074BCDR TL074IN",
    ("TL07xH", 2): "TL072HIDR TL072HIDDFR TL072HIPWR",
    ("TL07xH", 4): "TL074HIDR",
    ("TL08x", 1): "TL081CP TL081CDR TL081ACP",
    ("TL08x", 2): "TL082CP TL082CDR TL082BCP TL082IDR",
    ("TL06x", 2): "TL062CP TL062CDR TL062ACD",
    ("LM358", 2): "LM358P LM358DR LM358ADR LM358N/NOPB LM258DR LM158J LM358DR2G LM358N LM358PWR",
    ("LM358", 1): "LM321MF/NOPB",
    ("LM358B", 2): "LM358BIDR LM358BAIDR LM2904BIDR LM2904BAIDR",
    ("LM2904", 2): "LM2904DR LM2904N NCV2904DR2G LM2904P",
    ("LM2904", 4): "LM2902DR LM2902N LM2902KDR",
    ("LM2904V", 2): "LM2904VDR2G",
    ("uA741", 1): "UA741CP UA741CDR LM741CN/NOPB LM741H",
    ("RC4558", 2): "RC4558P RC4558DR RC4558ID NJM4558M NJM4558D BA4558F-E2",
    ("NJM4580", 2): "NJM4580D NJM4580E NJM4580M",
    ("BA4580R", 2): "BA4580RF-E2",
    ("NE5532", 2): "NE5532P NE5532AP NE5532DR NE5532ADR SA5532P NE5532DR2G NE5532N",
    ("NE5534", 1): "NE5534P NE5534AP NE5534DR SA5534AP",
    ("LM4562", 2): "LM4562NA/NOPB LM4562MAX/NOPB LME49720NA/NOPB",
    ("OP07", 1): "OP07CP OP07DP OP07CDR OP07EPZ OP07CSZ",
    ("OP27", 1): "OP27GPZ OP27GSZ OP27EP OPA27GP OPA27GU",
    ("OP37", 1): "OP37GPZ OPA37GU",
    ("OP177", 1): "OP177GPZ OP177FSZ",
    ("OP275", 2): "OP275GPZ OP275GSZ",
    ("OP295", 2): "OP295GPZ OP295GSZ-REEL7",
    ("OP295", 4): "OP495GSZ",
    ("LT1001", 1): "LT1001CN8#PBF LT1001ACN8",
    ("LT1013", 2): "LT1013DN8 LT1013CP LT1013DDR",
    ("LT1013", 4): "LT1014DN LT1014CN#PBF",
    ("LT1028", 1): "LT1028CN8#PBF LT1028ACS8",
    ("LT1678", 2): "LT1678CS8#PBF",
    ("LT1677", 1): "LT1677CS8#PBF LT1677IN8",
    ("OPA134", 1): "OPA134PA OPA134UA",
    ("OPA134", 2): "OPA2134PA OPA2134UA/2K5",
    ("OPA134", 4): "OPA4134UA",
    ("OPA227", 2): "OPA2227PA OPA2227UA",
    ("OPA277", 1): "OPA277PA OPA277UA",
    ("OPA340", 1): "OPA340NA/3K OPA340PA",
    ("OPA340", 2): "OPA2340EA/250 OPA2340UA",
    ("OPA333", 1): "OPA333AIDBVR OPA333AIDCKR",
    ("OPA333", 2): "OPA2333AIDR",
    ("OPA1678", 2): "OPA1678IDR OPA1678IDGKR",
    ("OPA1612", 2): "OPA1612AIDR",
    ("OPA548", 1): "OPA548T OPA548FKTWT",
    ("AD8605", 1): "AD8605ARTZ-REEL7",
    ("AD8605", 2): "AD8606ARZ AD8606ARMZ",
    ("AD8628", 1): "AD8628AUJZ-REEL7",
    ("AD712", 2): "AD712JNZ AD712KRZ",
    ("AD8065", 1): "AD8065ARTZ-REEL7",
    ("AD797", 1): "AD797ANZ AD797ARZ",
    ("ADA4522", 2): "ADA4522-2ARMZ ADA4522-2ARZ",
    ("MCP6001", 1): "MCP6001T-I/OT MCP6001UT-I/LT MCP6001RT-I/OT",
    ("MCP6001", 4): "MCP6004-I/SL MCP6004T-E/ST",
    ("MCP602x", 2): "MCP6022-I/P MCP6022T-E/SN",
    ("MCP628x", 2): "MCP6282-E/SN",
    ("MCP6V0x", 1): "MCP6V01-E/SN",
    ("TLC272", 2): "TLC272CP TLC272CDR TLC272ACP TLC277CP",
    ("TLC272", 4): "TLC274CN TLC274CDR",
    ("TLC271", 1): "TLC271CP TLC271BCD",
    ("TLV237x", 2): "TLV2372IDR TLV2372IP",
    ("TLV237x", 1): "TLV2371IDBVR",
    ("TLV900x", 2): "TLV9002IDR TLV9002IDGKR",
    ("TLV906x", 1): "TLV9061IDBVR TLV9061SIDBVR",
    ("LMV358A", 2): "LMV358AIDR",
    ("TS922", 2): "TS922IDT TS922AIDT TS922IYDT",
    ("LM6172", 2): "LM6172IM/NOPB LM6172IN",
    ("LMC662", 2): "LMC662CN/NOPB LMC662AIM",
    ("LMC662", 4): "LMC660CM/NOPB",
    ("CA3140", 1): "CA3140EZ CA3140AMZ",
    ("LF356", 1): "LF356N/NOPB LF356M",
    ("LF412", 2): "LF412CN/NOPB",
    ("TCA0372", 2): "TCA0372DP1G TCA0372DWG",
    ("L272", 2): "L272M L272D",
}

CODES = [
    (code, family, channels)
    for table in (READ, REMEMBERED)
    for (family, channels), codes in table.items()
    for code in codes.split()
]


def test_there_are_two_hundred_codes():
    """Each counts once."""
    assert len({code for code, _family, _channels in CODES}) >= 200


@pytest.mark.parametrize(("code", "family", "channels"), CODES)
def test_an_order_code_leads_to_its_family(code, family, channels):
    """Family and amplifiers in the package are those of the ordering table."""
    match = load().match(code)
    assert match.device is not None, f"{code} is taken as {match.sort}"
    assert (match.device.family, match.channels, match.also) == (family, channels, ())
