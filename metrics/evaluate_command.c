#include "io/command.h"
#include "io/memory.h"
#include "metrics/results_file.h"

#include <stdio.h>

static tg_code estimate(const tg_job *job, tg_error *e)
{
    double seconds, mib;
    const tg_code code = tg_evaluate_estimate(job, &seconds, &mib, e);
    if (code == TG_OK)
        printf("%s: %zu reconstruction%s, all inputs are in order; about %.0f s on one core and %.0f MiB\n",
               job->name.v, job->reconstructions.n, job->reconstructions.n == 1 ? "" : "s", seconds, mib);
    return code;
}

static tg_code run(tg_call *call, const void *options, tg_error *e)
{
    (void)options;
    tg_code code = TG_OK;
    tg_job job = {0};
    tg_evaluation ev = {0};
    char *text = NULL;
    TG_TRY(tg_job_read(call->operand[0], &job, e));
    if (call->output) TG_TRY(tg_evaluation_allowed(&job, call->output, call->force, e));
    if (call->check) {
        code = estimate(&job, e);
        goto done;
    }
    TG_TRY(tg_evaluate(&job, call->progress, &ev, e));
    tg_hand_on(&ev.remarks, NULL, e); /* the terminal shows them, too */
    TG_TRY(tg_evaluation_write(&ev, call->output, call->force, e));
    TG_TRY(tg_results_text(&ev, &text, e));
    printf("%s\nreport: %s/report.html\n", text, call->output);
    call->verdict = tg_verdict_code(ev.verdict);
done:
    tg_free(text);
    tg_evaluation_free(&ev);
    tg_job_free(&job);
    return code;
}

const tg_command tg_evaluate_command = {
    .name = "evaluate",
    .operands = "JOB.yaml",
    .what = "scan or simulate, reconstruct, measure and judge: the whole of a job",
    .example = "tomogauge evaluate phantoms/demo-job.yaml -o build/demo",
    .least = 1,
    .most = 1,
    .output = "DIR",
    .output_required = true,
    .run = run,
};
