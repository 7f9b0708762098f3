"""All paths of the service; those of tasks follow from the table of tasks."""

from starlette.routing import Route

from service.routes import pages, stored, tasks
from service.tasks import GET_FORMS, TASKS


def routes() -> list[Route]:
    """Every path, with its one method."""
    return [
        *(Route(f"/v1/{t.name}", tasks.post(t), methods=["POST"]) for t in TASKS.values()),
        Route("/v1/systems", stored.post_system, methods=["POST"]),
        Route("/v1/systems/{identity}", stored.get_system),
        *(
            Route(f"/v1/systems/{{identity}}/{name}", tasks.get(form))
            for name, form in GET_FORMS.items()
        ),
        Route("/v1/results/{identity}", stored.get_result),
        Route("/health/live", pages.live),
        Route("/health/ready", pages.ready),
        Route("/openapi.json", pages.document),
        Route("/problems/{name}", pages.problem),
        Route("/docs", pages.docs),
        Route("/", pages.start),
    ]
