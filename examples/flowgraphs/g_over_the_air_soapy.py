# SPDX-License-Identifier: GPL-3.0-or-later
"""
Over the air with a radio that SoapySDR drives. The link is that of f_over_the_air_uhd.py; only the ends differ.

Before you transmit: cable and attenuators first (60 dB or more between the ports), then a dummy load. On air only in a
band and at a power that you are licensed for, at a safe distance from people, and by the law of the place, which stands
above anything said here. Never overdrive an input. Nothing is sent until --permitted says that all this is seen to.
"""

from f_over_the_air_uhd import SAMPLES_PER_SYMBOL, AirLink, command_line, run_until_enter
from gnuradio import halfplane


def soapy_radio(arguments):
    """Sink and source of one device."""
    from gnuradio import soapy

    device = f"driver={arguments.driver}"
    out = soapy.sink(device, "fc32", 1, "", "", [""], [""])
    back = soapy.source(device, "fc32", 1, "", "", [""], [""])
    for end, gain in ((out, arguments.send_gain), (back, arguments.receive_gain)):
        end.set_sample_rate(0, arguments.symbol_rate * SAMPLES_PER_SYMBOL)
        end.set_frequency(0, arguments.frequency)
        end.set_gain(0, gain)
    return out, back


if __name__ == "__main__":
    wanted = command_line("The Firn line over the air, by SoapySDR.", driver="as SoapySDRUtil --find names it")
    run_until_enter(
        AirLink(
            halfplane.load_set(wanted.set), wanted.pattern, *soapy_radio(wanted), wanted.symbol_rate, wanted.permitted, wanted.log
        )
    )
