"""The registry: every mistake that the catalogue knows. A new one is a new file, a line here and a prior."""

from __future__ import annotations

from adjust.blunders.mistakes.another_mark import AnotherMark
from adjust.blunders.mistakes.antenna_height import AntennaHeight
from adjust.blunders.mistakes.axes_exchanged import AxesExchanged
from adjust.blunders.mistakes.counted_backwards import CountedBackwards
from adjust.blunders.mistakes.degrees_and_gon import DegreesAndGon
from adjust.blunders.mistakes.digit_misread import DigitMisread
from adjust.blunders.mistakes.digits_exchanged import DigitsExchanged
from adjust.blunders.mistakes.dropped_tape import DroppedTape
from adjust.blunders.mistakes.ends_exchanged import BACK_AND_FORE, ENDS_EXCHANGED
from adjust.blunders.mistakes.heights_of_setup import HeightMissing, HeightOfAnotherSetup, HeightsExchanged
from adjust.blunders.mistakes.interface import Mistake
from adjust.blunders.mistakes.metres_and_feet import MetresAndFeet
from adjust.blunders.mistakes.other_face import OtherFace
from adjust.blunders.mistakes.sign_lost import SignLost
from adjust.blunders.mistakes.slope_as_horizontal import SlopeAsHorizontal
from adjust.blunders.mistakes.staff_misread import StaffMisread
from adjust.blunders.mistakes.target_constant import TargetConstant
from adjust.blunders.mistakes.weather_correction import WeatherCorrection
from adjust.blunders.mistakes.whole_angle import WholeAngle

MISTAKES: tuple[Mistake, ...] = (
    DigitsExchanged(),
    DigitMisread(),
    WholeAngle(),
    OtherFace(),
    CountedBackwards(),
    BACK_AND_FORE,
    DegreesAndGon(),
    MetresAndFeet(),
    DroppedTape(),
    SlopeAsHorizontal(),
    TargetConstant(),
    WeatherCorrection(),
    SignLost(),
    StaffMisread(),
    ENDS_EXCHANGED,
    HeightMissing(),
    HeightsExchanged(),
    HeightOfAnotherSetup(),
    AnotherMark(),
    AntennaHeight(),
    AxesExchanged(),
)
