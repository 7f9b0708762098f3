# The service in a container. BASE may be any image with Python 3.11 or newer and its venv module.
#
# Until the service has keys it serves loopback addresses only, so share the host's network:
#   docker build -t wideberth .
#   docker run --network host --volume wideberth:/var/lib/wideberth wideberth
# and it answers on the host's 127.0.0.1:8080.
ARG BASE=python:3.13-slim

FROM ${BASE} AS build
WORKDIR /src
RUN python3 -m venv /opt/wideberth
COPY requirements.lock ./
RUN /opt/wideberth/bin/python -m pip install --no-cache-dir --require-hashes --no-deps \
    --requirement requirements.lock
COPY LICENSE README.md pyproject.toml ./
COPY schemas schemas
COPY service service
RUN /opt/wideberth/bin/python -m pip install --no-cache-dir --no-deps --no-build-isolation .

FROM ${BASE}
RUN install --directory --owner=10001 --group=10001 /var/lib/wideberth
COPY --from=build /opt/wideberth /opt/wideberth
ENV PATH=/opt/wideberth/bin:${PATH} \
    PYTHONUNBUFFERED=1 \
    WIDEBERTH_PORT=8080 \
    WIDEBERTH_STORE=sqlite:////var/lib/wideberth/store.sqlite
USER 10001:10001
WORKDIR /var/lib/wideberth
VOLUME /var/lib/wideberth
EXPOSE 8080
HEALTHCHECK --interval=30s --timeout=5s --start-period=20s CMD ["python3", "-c", \
    "import os, urllib.request as u; u.urlopen(f'http://127.0.0.1:{os.environ[\"WIDEBERTH_PORT\"]}/health/ready', timeout=4)"]
ENTRYPOINT ["wideberth"]
CMD ["serve"]
