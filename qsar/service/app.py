"""The application: its addresses, and what is answered there."""

from __future__ import annotations

import json
from collections.abc import AsyncIterator, Callable
from contextlib import asynccontextmanager
from functools import partial
from importlib.resources import files
from typing import Annotated, Any
from urllib.parse import quote

from fastapi import FastAPI, File, Form, Query, Request, UploadFile
from fastapi.exceptions import RequestValidationError
from fastapi.responses import HTMLResponse, JSONResponse, Response, StreamingResponse
from jinja2 import Environment, PackageLoader, select_autoescape
from starlette.exceptions import HTTPException

from qsar import __version__
from qsar.service import schemas as s
from qsar.service.exports import MEDIA, report_page
from qsar.service.guard import Guard
from qsar.service.settings import Refused, Settings
from qsar.service.streaming import Plain, predict_part, stream
from qsar.service.workers import TimeExceeded, Workers
from qsar.writing import Row

V1 = "/api/v1"
_TYPES = {".css": "text/css", ".js": "text/javascript", ".svg": "image/svg+xml"}
_SVG_POLICY = "default-src 'none'; style-src 'unsafe-inline'"
_REPORT_POLICY = "sandbox; default-src 'none'; style-src 'unsafe-inline'; img-src data:"
_SAID = {
    400: "The request cannot be read.",
    403: "Foreign host or origin.",
    408: "The request did not arrive in time.",
    413: "Too large, or too many structures.",
    415: "A kind of file that is not read.",
    422: "A structure or value that cannot be used.",
    500: "An error of the program.",
    503: "Takes too long, or too many requests at once.",
}
PROBLEMS: dict[int | str, dict[str, Any]] = {
    code: {"model": s.Problem, "description": text} for code, text in _SAID.items()
}


def create_app(settings: Settings | None = None) -> FastAPI:
    """Make the application.

    Parameters
    ----------
    settings : Settings, optional

    Returns
    -------
    fastapi.FastAPI
        Its worker processes start with it and end with it.
    """
    chosen = settings or Settings()
    workers = Workers(chosen)

    @asynccontextmanager
    async def living(app: FastAPI) -> AsyncIterator[None]:
        workers.start()
        try:
            yield
        finally:
            await workers.stop()

    app = FastAPI(
        title="acidity",
        version=__version__,
        description="Aqueous pKa of carboxylic acids, with an interval and a verdict on each.",
        docs_url=None,
        redoc_url=None,
        openapi_url="/openapi.json",
        lifespan=living,
        responses=PROBLEMS,
    )
    app.state.workers = workers
    app.add_middleware(Guard, settings=chosen)
    app.add_exception_handler(Refused, _on_refused)
    app.add_exception_handler(RequestValidationError, _on_invalid)
    app.add_exception_handler(HTTPException, _on_http)
    templates = Environment(
        loader=PackageLoader("qsar.service"), autoescape=select_autoescape(default=True), trim_blocks=True
    )
    templates.filters["number"] = lambda value, digits=2: f"{value:.{digits}f}".replace("-", "−")
    templates.filters["svg_data"] = lambda svg: f"data:image/svg+xml,{quote(svg)}"
    templates.filters["signed"] = lambda value: f"{value:+.2f}".replace("-", "−")
    _add_pages(app, templates)
    _add_acids(app, workers, chosen)
    _add_lists(app, workers, chosen)
    _add_files(app, workers, chosen, templates)
    return app


async def _on_refused(request: Request, refusal: Exception) -> JSONResponse:
    assert isinstance(refusal, Refused)
    headers = {"retry-after": "2"} if refusal.status == 503 else None
    return JSONResponse({"detail": refusal.sentence}, refusal.status, headers)


async def _on_invalid(request: Request, problem: Exception) -> JSONResponse:
    """One sentence in place of a list of errors; what was sent is not repeated."""
    assert isinstance(problem, RequestValidationError)
    first = problem.errors()[0]
    where = ".".join(str(part) for part in first.get("loc", ())[1:])[:120]
    said = "".join(c if c.isprintable() else "?" for c in f"{where}: {first.get('msg', 'cannot be read')}")
    return JSONResponse({"detail": said}, 422)


async def _on_http(request: Request, problem: Exception) -> JSONResponse:
    assert isinstance(problem, HTTPException)
    said = {404: "there is nothing at this address", 405: "this address does not take that kind of request"}
    detail = said.get(problem.status_code, str(problem.detail))
    return JSONResponse({"detail": detail}, problem.status_code, problem.headers)


def _add_pages(app: FastAPI, templates: Environment) -> None:
    """The page, the page of the interface, and their local assets."""
    folder = files("qsar.service").joinpath("static")
    assets = {item.name: item.read_bytes() for item in folder.iterdir() if item.name[-4:] != ".pyc"}

    @app.get("/", include_in_schema=False)
    async def page() -> HTMLResponse:
        return HTMLResponse(templates.get_template("page.html").render(version=__version__))

    @app.get("/api", include_in_schema=False)
    async def interface() -> HTMLResponse:
        return HTMLResponse(templates.get_template("interface.html").render(api=app.openapi(), dumps=json.dumps))

    @app.get("/static/{name}", include_in_schema=False)
    async def asset(name: str) -> Response:
        if name not in assets:
            raise HTTPException(404)
        kind = _TYPES.get(name[name.rfind(".") :], "application/octet-stream")
        return Response(assets[name], media_type=kind, headers={"cache-control": "no-cache"})


async def explained(workers: Workers, settings: Settings, task: str, **arguments: Any) -> Any:
    """Have a task done with contributions or, where these take too long, without."""
    try:
        return await workers.run(task, seconds=settings.seconds, **arguments)
    except TimeExceeded:
        return await workers.run(task, seconds=settings.seconds, contributions=False, **arguments)


def _add_acids(app: FastAPI, workers: Workers, settings: Settings) -> None:
    """Questions about one acid."""
    kept: dict[str, Any] = {}

    async def fixed(task: str) -> Any:
        """What does not change while the service runs."""
        if task not in kept:
            kept[task] = await workers.run(task, seconds=settings.file_seconds)
        return kept[task]

    ask = partial(workers.run, seconds=settings.seconds)

    @app.get(f"{V1}/about", response_model=s.AboutAnswer, tags=["service"])
    async def about() -> Any:
        """The model, the names it knows, the limits, and how busy the service is."""
        known = await fixed("about")
        return {
            "model": known["name"],
            "card": known["card"],
            "names": known["names"],
            "limits": {
                "structures": settings.max_structures,
                "rows": settings.max_rows,
                "report": settings.max_report,
                "bytes": settings.max_body,
                "seconds": settings.seconds,
            },
            "workers": {
                "size": workers.size,
                "busy": workers.busy,
                "waiting": workers.waiting,
                "replaced": workers.replaced,
                "done": workers.done,
            },
        }

    @app.get(f"{V1}/parents", response_model=list[s.NamedSmiles], tags=["build"])
    async def parents() -> Any:
        """Acids to build from."""
        return await fixed("parents")

    @app.get(f"{V1}/groups", response_model=list[s.GroupAnswer], tags=["build"])
    async def groups() -> Any:
        """Groups that can be put in place of a hydrogen or a substituent."""
        return await fixed("groups")

    @app.get(f"{V1}/acid", response_model=s.AcidAnswer, tags=["acid"])
    async def acid(smiles: s.SmilesInAddress, coverage: s.Coverage = 0.9, step: s.StepNumber = 1) -> Any:
        """Everything about one acid: steps, evidence, contributions, drawing, positions."""
        return JSONResponse(await explained(workers, settings, "acid", smiles=smiles, coverage=coverage, step=step))

    @app.post(f"{V1}/swap", response_model=s.AcidAnswer, tags=["build"])
    async def swap(question: s.SwapQuestion) -> Any:
        """Everything about the acid with another group at a place."""
        return JSONResponse(await explained(workers, settings, "swap", **question.model_dump()))

    @app.post(f"{V1}/analogues", response_model=s.AnaloguesAnswer, tags=["build"])
    async def analogues(question: s.AnaloguesQuestion) -> Any:
        """Every group of a list at one place, by rising pKa, with intervals and verdicts."""
        asked = question.model_dump()
        asked["only"] = asked.pop("groups")
        return JSONResponse(await workers.run("all_groups", seconds=3 * settings.seconds, **asked))

    @app.get(
        f"{V1}/drawing", response_class=Response, responses={200: {"content": {"image/svg+xml": {}}}}, tags=["acid"]
    )
    async def drawing(
        smiles: s.SmilesInAddress,
        width: Annotated[int, Query(ge=40, le=1000)] = 180,
        height: Annotated[int, Query(ge=40, le=1000)] = 120,
        dark: bool = False,
    ) -> Response:
        """A drawing as SVG."""
        svg = await ask("drawing", smiles=smiles, width=width, height=height, dark=dark)
        headers = {"content-security-policy": _SVG_POLICY, "cache-control": "private, max-age=3600"}
        return Response(svg, media_type="image/svg+xml", headers=headers)

    def decision(kind: str, Question: type) -> Callable[..., Any]:
        async def answer(question: Question) -> Any:  # type: ignore[valid-type]
            return JSONResponse(await ask("decide", kind=kind, question=question.model_dump()))  # type: ignore[attr-defined]

        answer.__doc__ = Question.__doc__
        return answer

    for kind, Question in _DECISIONS.items():
        route = decision(kind, Question)
        route.__annotations__ = {"question": Question, "return": Any}
        app.post(f"{V1}/decide/{kind}", name=f"decide_{kind}", response_model=s.DecisionAnswer, tags=["decide"])(route)


_DECISIONS: dict[str, type] = {
    "base": s.BaseQuestion,
    "window": s.WindowQuestion,
    "buffer": s.BufferQuestion,
    "risk": s.RiskQuestion,
}


def _plain(structures: list[s.Structure]) -> list[Plain]:
    return [(x.id or str(n), x.smiles, "", None) for n, x in enumerate(structures, start=1)]


def _check_number(n: int, most: int, what: str) -> None:
    if n > most:
        raise Refused(413, f"more than {most:,} structures {what}; give fewer")


def _add_lists(app: FastAPI, workers: Workers, settings: Settings) -> None:
    """Questions about many acids."""

    @app.post(f"{V1}/predict", response_model=s.Rows, tags=["table"])
    async def predict(question: s.PredictQuestion) -> Any:
        """Rows of the table of predictions, all at once."""
        _check_number(len(question.structures), settings.max_structures, "in one request (use the stream)")
        rows = await predict_part(
            workers, settings, _plain(question.structures), question.coverage, [0], background=False
        )
        return JSONResponse({"rows": [row for own in rows for row in own]})

    @app.post(f"{V1}/read", response_model=s.ReadAnswer, tags=["table"])
    async def read(question: s.TextQuestion) -> Any:
        """Find the structures in a text: SMILES with names, names of known acids, MOL blocks, a table."""
        found = await workers.run(
            "read_text", seconds=settings.file_seconds, text=question.text, most=settings.max_rows
        )
        names = ("id", "smiles", "where", "error")
        return JSONResponse({"structures": [dict(zip(names, r, strict=True)) for r in found]})

    lines: dict[int | str, dict[str, Any]] = {
        200: {"content": {"application/x-ndjson": {"schema": {"type": "string"}}}, "description": "One event a line."}
    }

    def streamed(records: list[Plain], coverage: float) -> StreamingResponse:
        return StreamingResponse(stream(workers, settings, records, coverage), media_type="application/x-ndjson")

    @app.post(f"{V1}/stream", response_class=StreamingResponse, responses=lines, tags=["table"])
    async def stream_list(question: s.PredictQuestion) -> StreamingResponse:
        """Rows as they come: events `start`, `rows`, `end`, `failed`, one JSON object a line."""
        _check_number(len(question.structures), settings.max_rows, "at once")
        return streamed(_plain(question.structures), question.coverage)

    @app.post(f"{V1}/file", response_class=StreamingResponse, responses=lines, tags=["table"])
    async def stream_file(
        file: Annotated[UploadFile, File(description="CSV, TSV, XLSX, SMI, SDF or MOL.")],
        coverage: Annotated[float, Form(ge=0.5, le=0.99)] = 0.9,
    ) -> StreamingResponse:
        """Rows of a file as they come."""
        content = await file.read()
        records = await workers.run(
            "read_file",
            seconds=settings.file_seconds,
            background=True,
            content=content,
            name=(file.filename or "")[-200:],
            most=settings.max_rows,
        )
        return streamed(records, coverage)


def _add_files(app: FastAPI, workers: Workers, settings: Settings, templates: Environment) -> None:
    """Files to take away."""

    @app.post(
        f"{V1}/export",
        response_class=Response,
        responses={200: {"content": {m.partition(";")[0]: {} for m in MEDIA.values()}}},
        tags=["files"],
    )
    async def export(question: s.ExportQuestion) -> Response:
        """Rows as CSV, XLSX, JSON or SDF; no cell becomes a formula."""
        _check_number(len(question.rows), 6 * settings.max_rows, "in one file")
        rows = [Row(**row.model_dump()) for row in question.rows]
        content = await workers.run(
            "export", seconds=settings.file_seconds, background=True, kind=question.format, rows=rows
        )
        return Response(content, media_type=MEDIA[question.format], headers=_attached(f"acids.{question.format}"))

    @app.post(
        f"{V1}/report", response_class=Response, responses={200: {"content": {"text/html": {}}}}, tags=["files"]
    )
    async def report(question: s.ReportQuestion) -> Response:
        """The HTML report on some acids, and on decisions, as one file that opens offline."""
        _check_number(len(question.structures), settings.max_report, "in one report")
        pairs = [(x.id or str(n), x.smiles) for n, x in enumerate(question.structures, start=1)]
        acids: list[dict[str, Any]] = []
        for start in range(0, len(pairs), 10):
            part = pairs[start : start + 10]
            acids += await explained(
                workers, settings, "report", background=True, smiles=part, coverage=question.coverage
            )
        decisions = [
            await workers.run("decide", seconds=settings.seconds, kind=q.kind, question=q.model_dump())
            for q in question.decisions
        ]
        headers = {**_attached("acids.html"), "content-security-policy": _REPORT_POLICY}
        return Response(report_page(templates, acids, decisions), media_type="text/html", headers=headers)


def _attached(name: str) -> dict[str, str]:
    return {"content-disposition": f'attachment; filename="{name}"'}
