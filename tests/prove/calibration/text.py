"""The words of the page that carry no results."""

from __future__ import annotations

import math

from tests.prove.calibration import climates, errors, homes, loads, plan

HEAD = """
# Calibration: does 90 % mean 90 %?

Written by `make calibration`; every number, and every sentence with a number, comes from the run.
Simulated homes a cell, and the Monte Carlo standard error of a coverage of 0.9: {sizes}. As many
homes again in every cell of bills and days, on which nothing was done. {versions}; kernels
{kernels}: with these the same cell gives the same numbers. {missing}

A range that is called 90 % should hold the truth nine times in ten. Here the truth is known,
because the homes are invented, so it can be counted: for this program's default, for the plain
delta method that takes bills as independent, and for the formula of ASHRAE Guideline 14, so that a
reader sees what each would have claimed. The method is [method.md](method.md), section 5.
"""

TARGETS = """
A target's band speaks of the true coverage; each cell's is measured with a Monte Carlo error, so a
cell near an edge may fall on either side of it.
"""

DESIGN = f"""
## What is measured, and on what homes

**Three truths.** *NAC before*: the home's true parameters at the long-term year of its station.
*Normalized savings*: true NAC before less true NAC after. *Avoided use*: what the true baseline
would have used in the weather of the bills after the work, less what the home is expected to use in
it after the work: the change that the work made. The bills after the work carry their own errors,
which would have been there without it too, so the interval has to hold the noise of their sum as
well as the error of the fit. (Against the bills as metered, errors and all, the same interval would
cover more often.) For the Guideline 14 formula: avoided use ± ΔS, t for 90 % with n − parameters,
k = 1.26, n′ from the lag-1 autocorrelation of the home's own baseline residuals (not below 0), and
again with n′ = n. Reddy & Claridge 2000, HVAC&R Research 6(1).

**The path.** The same compiled comparison that `normalize program` runs, with the choice of form
on either side and the same reasons for giving no answer ([method.md](method.md), sections 3 and 9).
Coverage is counted among the homes with an answer.

**The homes.** Every home has its own parameters: true NAC {365 * loads.MEAN_USE:g} units, of which
heating takes {loads.SHARES["heating"][0][0]:.0%}–{loads.SHARES["heating"][0][1]:.0%}, cooling
{loads.SHARES["cooling"][2][0]:.0%}–{loads.SHARES["cooling"][2][1]:.0%}, and where there are both
{loads.SHARES["heating and cooling"][0][0]:.0%}–{loads.SHARES["heating and cooling"][0][1]:.0%} and
{loads.SHARES["heating and cooling"][2][0]:.0%}–{loads.SHARES["heating and cooling"][2][1]:.0%};
balance temperatures {loads.SHARES["heating"][1][0]:g}–{loads.SHARES["heating"][1][1]:g} °F for
heating and {loads.SHARES["cooling"][3][0]:g}–{loads.SHARES["cooling"][3][1]:g} °F for cooling, at
least {loads.REACH_F:g} °F inside the climate's seasons. The work takes a share drawn between 0 and
{loads.MOST_EFFECT:.0%} from every slope, a third of that from the base load, and moves balance
temperatures by up to {loads.TAU_EFFECT_F * loads.MOST_EFFECT:.1f} °F. Bills are 28–33 days long
(57–65 two-monthly), begin on any day of a year, and {homes.WORK_DAYS} days of work lie between the
sides. Deliveries come when a tank's worth
({homes.DELIVERY_SPREAD[0]:g}–{homes.DELIVERY_SPREAD[1]:g} of an ordinary one) has been
used: often in winter, seldom in summer. Weather is simulated for {climates.STATIONS} invented
stations a climate, with seasons, spells and daily persistence; the long-term year is the ten years
before the bills.

**The errors.** Noise is the standard deviation of the error of an ordinary bill as a share of mean
use; it shrinks with the square root of a bill's days, as the weights suppose, except where a spoke
says otherwise. Neighbouring bills' errors have lag-1 correlation ρ and run on through the work.
Heavy tails: innovations of Student's t with {errors.T_DF} degrees of freedom. Outliers: one bill in
{1 / errors.OUTLIER_SHARE:.0f} is off by a further {errors.OUTLIER_SIZE:g} standard deviations.
Estimated readings: one bill in {1 / homes.ESTIMATED_SHARE:.0f}, joined to the next. Daily data: the
weekly pattern is as strong as the daily error; the slow component holds half of the variance and
forgets in {-1 / math.log(errors.SLOW_RHO):.0f} days.

**The design.** Not every combination: a full core of six forms × {len(plan.BILLS)} numbers of
bills × {len(plan.RHOS)} correlations at 10 % noise in a temperate climate, and spokes that change
one thing at a time from the core's cells with ρ = {plan.SPOKE_RHO:g} and
{" or ".join(map(str, plan.SPOKE_BILLS))} bills. The default's four forms are offered; *line* and
*two slopes* are chosen only when asked for, so in their cells they are asked for (and in one spoke
they are not). Each cell has a seed made from what it is, so a cell gives the same numbers alone or
among others.
"""

CHOICES = """
Where the four default forms are offered: picked by BIC (the default), picked by AICc, or NAC
averaged over all forms that pass the screens, by weights ∝ exp(−½ BIC), with the standard error of
Buckland, Burnham & Augustin 1997 (Biometrics 53:603–618). The average is built from the two sides
apart, so BIC's pick built the same way (“sides apart”) stands beside it: compare coverage and width
with that one. Rms errors and width of normalized savings are in percent of true NAC.
"""

LIMITS = """
## What this study cannot speak of

- **Occupants.** Simulated homes keep their habits but for noise. Guests, a new baby, a closed room,
  a second refrigerator, a changed thermostat are read as savings or as losses by every method here;
  no range of bills' noise includes them.
- **The station.** Every home has the weather of its station exactly. A station up a hill, by a lake
  or of another microclimate adds an error that is not in any range.
- **The choice of long-term year.** The true NAC is that of the same ten years that the fit is
  normalized to. Other years give other answers.
- **The form of the truth.** Homes follow one of the six forms exactly. Real loads bend: heat pumps
  change their efficiency with temperature, sun and wind matter, heavy walls delay.
- **How bills err.** The errors simulated here are autoregressions with the tails and scales named
  above. Nobody knows how real bills err; the placebo on real histories is the only check of that.
- **Attribution.** That use changed at the date of the work is not that the work changed it.
- **Totals of a program.** Homes here err independently of each other. Real ones share weather,
  prices and hard times.
"""
