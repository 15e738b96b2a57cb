// Package traps holds no program. It lists twenty ways in which figures of thaw
// and frost go wrong in practice, with the tests that fail when one is sprung.
// A test here reads the list and looks for each of them; a trap that no other
// package tests is tested here.
//
//	 1 max less min of the cumulative curve in place of its largest rise; an extremum on the window's edge taken for final
//	   indices/degreeday.TestRiseIsNotTheNaiveRange indices/degreeday.TestCurveIsTheLargestRise indices/degreeday.TestSeasonFlags
//	 2 the spring low declared at the first warm days
//	   indices/degreeday.TestRelapseInSpring indices/degreeday.TestSeasonFlags indices.TestSpringRelapse indices/outlook.TestRelapseMovesTheLow
//	 3 the running value after the autumn high given as the season's index
//	   indices/degreeday.TestRiseOfHandSeries indices/degreeday.TestColdAfterTheHigh indices/degreeday.TestToDateNeverFallsAndCurveIsAtMostSum
//	 4 indices of different definitions mixed
//	   indices/traps.TestDefinitionsAreKeptApart alerts.TestDefinitions indices/surface.TestAppliedByHand
//	 5 degF.d compared with degC.d, or K.h; a surface index with an air value
//	   indices/traps.TestUnitsOfADesignValue alerts.TestEqualDesignValues alerts.TestDefinitions ingest/normal.TestCelsius
//	 6 missing days taken as zero, or skipped
//	   indices/degreeday.TestGapIsNotZero indices/daily.TestGapIsNeitherSkippedNorZero indices/degreeday.TestBoundsHoldForEveryFilling indices/filling.TestFillProperties
//	 7 another rule of the mean, day boundary or place within a record
//	   indices/traps.TestRuleOfTheMeanIsTold indices.TestChangedRules cmd/thawledger.TestJoinedRecord
//	 8 an n-factor of the other season, or of a whole season on part of one
//	   indices/surface.TestFactorsKeepToTheirKind indices/surface.TestPartOfSeasonIsSaid indices/surface.TestMeasuredRefuses indices/surface.TestInForce
//	 9 the conductivity of the wrong phase; water content of the whole mass for that of the dry
//	   indices/ground.TestEachFrontHasItsOwnConductivity indices/ground.TestHeats indices/ground.TestConductivities
//	10 lambda: sign and unit of the temperature at depth, the year for the season's length
//	   indices/ground.TestBerggrenOneLayer indices/ground.TestLambdaTable indices/ground.TestLambdaIsNeumannOfEqualProperties
//	11 limits for values a minute apart on hours and days; the zero curtain taken for a fault
//	   indices/quality.TestTrueWarmSpellsStay indices/quality.TestThreeDegreesAreNoStepOfDays indices/quality.TestStepLimit indices/quality.TestHours indices/quality.TestZeroCurtain
//	12 days at 0 degC thrown out as missing; 0 degF taken for -17.8 degC
//	   indices/traps.TestDaysAtZeroStay indices/quality.TestPlantedFaults indices/quality.TestZeroCurtain
//	13 29 February dropped; dates aligned by the day of the year
//	   indices/traps.TestLeapDayCounts indices.TestLeapDayAndNoSeason indices/daily.TestBoundsAreThoseOfEveryYear indices/filling.TestNormalByMonthAndDay indices/quality.TestClimatologyByDefinition
//	14 what was known when it was told is lost; alerts deleted when data are revised
//	   alerts.TestTraceable alerts.TestWithdrawal alerts.TestReplacedDesignValue cmd/thawledger.TestEdits cmd/thawledger.TestApproval
//	15 late, repeated and unordered rows; local time; -99, -9999, 999.9; decimal commas; tenths
//	   indices/traps.TestSentinels indices.TestOrderOfArrival ingest/normal.TestParseDecimalComma ingest/normal.TestNamedZone ingest/normal.TestCelsius ingest/csvfeed.TestShapes
//	16 Gumbel by habit; signs of the GEV shape; return periods far beyond the record
//	   indices/extreme.TestGumbelIsNotTheHabit indices/extreme.TestGEVShape indices/extreme.TestPeriod indices/extreme.TestIntervalOfTheMedian
//	17 design values of a colder climate taken for today's
//	   indices/chance.TestWarmingIsMadeGood indices/outlook.TestMovedFollowsTheTrend indices/outlook.TestTrendInHindcasts indices/trend.TestGilbert
//	18 a load restriction's thaw index taken for the engineering index
//	   indices/traps.TestLoadRestrictionIndexIsAnother
//	19 0 or NaN for a season that there is not; seasons of the southern hemisphere
//	   indices/traps.TestNoSeasonIsSaid indices/degreeday.TestWindowAt indices/ground.TestFrostNumber indices/surface.TestNoAirSeason indices/outlook.TestNoSeason
//	20 an open season ranked with those that are over; an incomplete one left out that belongs there
//	   indices/traps.TestOpenSeasonIsSaid indices/extreme.TestIncompleteSeasonIsALowerBound indices/extreme.TestBoundsOfMostSevere indices/outlook.TestMembers
package traps
