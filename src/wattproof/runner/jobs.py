"""Which procedure a plan around the power statement asks for."""

from wattproof.procedures import (
    crosstalk,
    efficiency,
    frequency,
    gain,
    idle,
    output_resistance,
    response,
    response_result,
)
from wattproof.procedures.around_plan import AroundPlan
from wattproof.runner.around import Job

_JOBS = {
    idle.IdlePlan: Job("idle", idle.idle, idle.conclude),
    crosstalk.CrosstalkPlan: Job("crosstalk", crosstalk.crosstalk, crosstalk.conclude),
    efficiency.EfficiencyPlan: Job("efficiency", efficiency.efficiency, efficiency.conclude),
    frequency.FrequencyPlan: Job("frequency", frequency.frequency, frequency.conclude),
    gain.GainPlan: Job("gain", gain.gain, gain.conclude),
    output_resistance.OutputResistancePlan: Job(
        "output-resistance", output_resistance.output_resistance, output_resistance.conclude
    ),
    response.ResponsePlan: Job("response", response.response, response_result.conclude),
}


def job_for(plan: AroundPlan) -> Job:
    """Return the job of a plan's kind."""
    return _JOBS[type(plan)]
